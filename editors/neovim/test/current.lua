package.path = vim.fs.dirname(debug.getinfo(1, 'S').source:sub(2)) .. '/?.lua;' .. package.path
local steps = require('steps')

vim.cmd('filetype plugin on')
vim.lsp.enable('crenate')
vim.cmd.edit('sample.cren')
if vim.bo.filetype ~= 'crenate' then
  steps.fail('the file type is ' .. vim.bo.filetype)
end
steps.wait('the server', function() return #vim.lsp.get_clients({ bufnr = 0 }) == 1 end)
local client = vim.lsp.get_clients({ bufnr = 0 })[1]
local request = function(...) return client:request(...) end
local facade = { request = request }
if client.offset_encoding ~= 'utf-8' then
  steps.fail('positions are counted in ' .. client.offset_encoding)
end

-- A misspelt material is found, and mended by its fix.
steps.wait('the finding', function() return steps.finding('unknown-name') ~= nil end)
local finding = steps.finding('unknown-name')
if finding.lnum ~= 10 or finding.col ~= 18 then
  steps.fail('it is found at ' .. finding.lnum .. ':' .. finding.col)
end
vim.api.nvim_win_set_cursor(0, { finding.lnum + 1, finding.col })
vim.lsp.buf.code_action({ apply = true, filter = function(action) return action.isPreferred or action.kind == 'quickfix' and action.title:find('wall') end })
steps.wait('the fix', function() return steps.text():find('of wall') ~= nil end)
steps.wait('the finding to go', function() return #vim.diagnostic.get(0) == 0 end)

-- The hover tells the gap; an edit changes it.
local before = steps.gap(steps.ask(facade, 'textDocument/hover', 'tern').contents.value)
steps.replace('5.4 nm', '8.4 nm')
local after = steps.gap(steps.ask(facade, 'textDocument/hover', 'tern').contents.value)
local expected = dofile(vim.fs.dirname(debug.getinfo(1, 'S').source:sub(2)) .. '/expected.lua')
steps.near('the gap before the edit', before, expected.before, expected.within)
steps.near('the gap after the edit', after, expected.after, expected.within)

-- The same gap stands behind the heading.
vim.lsp.inlay_hint.enable(true, { bufnr = 0 })
steps.wait('the hint', function()
  for _, hint in ipairs(vim.lsp.inlay_hint.get({ bufnr = 0 })) do
    local label = hint.inlay_hint.label
    if hint.inlay_hint.position.line == 8 and label:find(tostring(math.floor(after)), 1, true) then
      return true
    end
  end
  return false
end)

-- The standard layout.
vim.lsp.buf.format({ async = false, timeout_ms = 10000 })
steps.wait('the standard layout', function() return steps.text():find('  layer     8.4 nm of basin', 1, true) ~= nil end)

-- The editor can leave at once.
client:stop()
steps.wait('the server to end', function() return client:is_stopped() end)
vim.cmd('qall!')
