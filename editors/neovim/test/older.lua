package.path = debug.getinfo(1, 'S').source:sub(2):match('(.*)/') .. '/?.lua;' .. package.path
local steps = require('steps')

local id = vim.lsp.start_client({ name = 'crenate', cmd = { 'crenate', 'serve' }, root_dir = vim.fn.getcwd() })
vim.bo.filetype = 'crenate'
vim.lsp.buf_attach_client(0, id)
local client = vim.lsp.get_client_by_id(id)
steps.wait('the server', function() return client.initialized end)
if client.offset_encoding ~= 'utf-16' then
  steps.fail('positions are counted in ' .. client.offset_encoding)
end

-- A character of two UTF-16 units before the place: positions still agree.
vim.api.nvim_buf_set_lines(0, 8, 9, false, { 'crystal tern', '  title "🙂" of' })
steps.wait('the unreadable line', function() return steps.finding('unreadable-line') ~= nil end)
local line, column = steps.find(' of')
local finding = steps.finding('unreadable-line')
if finding.lnum ~= line or finding.col ~= column + 1 then
  steps.fail('it is found at ' .. finding.lnum .. ':' .. finding.col .. ', not ' .. line .. ':' .. column + 1)
end
steps.replace('"🙂" of', '"🙂"')
steps.wait('the line to read', function() return steps.finding('unreadable-line') == nil end)

steps.wait('the finding', function() return steps.finding('unknown-name') ~= nil end)
finding = steps.finding('unknown-name')
line, column = steps.find('2.6 nm of wal')
column = column + #'2.6 nm of '
if finding.lnum ~= line or finding.col ~= column then
  steps.fail('it is found at ' .. finding.lnum .. ':' .. finding.col .. ', not ' .. line .. ':' .. column)
end
local range = { start = { line = finding.lnum, character = finding.col }, ['end'] = { line = finding.lnum, character = finding.col } }
local actions = steps.ask(client, 'textDocument/codeAction', 'tern', { range = range, context = { diagnostics = { finding.user_data.lsp and {
  range = { start = range.start, ['end'] = { line = finding.end_lnum, character = finding.end_col } },
  message = finding.message,
  code = 'unknown-name',
} } } })
for _, action in ipairs(actions) do
  if action.kind == 'quickfix' and action.title:find('wall') then
    vim.lsp.util.apply_workspace_edit(action.edit, client.offset_encoding)
    break
  end
end
steps.wait('the fix', function() return steps.text():find('of wall') ~= nil end)
steps.wait('the finding to go', function() return steps.finding('unknown-name') == nil end)

-- The hover tells the gap; an edit changes it.
local expected = dofile(debug.getinfo(1, 'S').source:sub(2):match('(.*)/') .. '/expected.lua')
local function gap() return steps.gap(steps.ask(client, 'textDocument/hover', 'tern').contents.value) end
steps.near('the gap before the edit', gap(), expected.before, expected.within)
steps.replace('5.4 nm', '8.4 nm')
steps.near('the gap after the edit', gap(), expected.after, expected.within)

vim.lsp.buf.formatting_sync(nil, 10000)
steps.wait('the standard layout', function() return steps.text():find('  layer     8.4 nm of basin', 1, true) ~= nil end)

client.stop()
steps.wait('the server to end', function() return client.is_stopped() end)
vim.cmd('qall!')
