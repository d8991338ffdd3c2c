autocmd BufRead,BufNewFile *.cren setfiletype crenate
