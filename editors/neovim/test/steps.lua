-- Steps that the tests of both Neovims share.
local steps = {}

-- Ends the editor with a message when `condition` does not come true.
function steps.wait(what, condition)
  if not vim.wait(30000, condition, 20) then
    steps.fail('waited in vain for ' .. what)
  end
  io.stderr:write('  ' .. what .. '\n')
end

function steps.fail(message)
  io.stderr:write('FAILED: ' .. message .. '\n')
  for _, finding in ipairs(vim.diagnostic.get(0)) do
    io.stderr:write('  shown: ' .. finding.message .. '\n')
  end
  io.stderr:write(table.concat(vim.api.nvim_buf_get_lines(0, 0, -1, false), '\n') .. '\n')
  vim.cmd('cquit 1')
end

function steps.text()
  return table.concat(vim.api.nvim_buf_get_lines(0, 0, -1, false), '\n')
end

-- The line (from 0) and byte of the first place where `needle` stands.
function steps.find(needle)
  for number, line in ipairs(vim.api.nvim_buf_get_lines(0, 0, -1, false)) do
    local start = line:find(needle, 1, true)
    if start then
      return number - 1, start - 1
    end
  end
  steps.fail('the text has no ' .. needle)
end

function steps.replace(needle, new)
  local line, column = steps.find(needle)
  vim.api.nvim_buf_set_text(0, line, column, line, column + #needle, { new })
end

function steps.finding(code)
  for _, finding in ipairs(vim.diagnostic.get(0)) do
    if finding.code == code or (finding.user_data and finding.user_data.lsp and finding.user_data.lsp.code == code) then
      return finding
    end
  end
end

-- What the server answers about the place where `needle` stands.
function steps.ask(client, method, needle, more)
  local line, column = steps.find(needle)
  local params = vim.tbl_extend('force', {
    textDocument = { uri = vim.uri_from_bufnr(0) },
    position = { line = line, character = column },
  }, more or {})
  local reply
  client.request(method, params, function(error, result)
    reply = { error = error, result = result }
  end, vim.api.nvim_get_current_buf())
  steps.wait('an answer to ' .. method, function() return reply ~= nil end)
  if reply.error then
    steps.fail(method .. ': ' .. vim.inspect(reply.error))
  end
  return reply.result
end

-- The size of the lowest gap in meV, as a hover's text tells it.
function steps.gap(text)
  local size = text:match('([%d.]+)%s*meV')
  return size and tonumber(size)
end

-- Ends the editor where a gap in meV is not as expected.
function steps.near(what, value, expected, within)
  if not value or math.abs(value - expected) > within then
    steps.fail(('%s is %s meV and should be %s'):format(what, value, expected))
  end
  io.stderr:write(('  %s: %s meV\n'):format(what, value))
end

return steps
