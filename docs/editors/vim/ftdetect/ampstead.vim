" Cells and process files of ampstead.
autocmd BufNewFile,BufRead *.cell,*.process setfiletype ampstead
