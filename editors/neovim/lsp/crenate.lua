-- The language server of crenate, for `vim.lsp.enable('crenate')` (Neovim 0.11 and later).
return {
  cmd = { 'crenate', 'serve' },
  filetypes = { 'crenate' },
  root_markers = { '.git' },
}
