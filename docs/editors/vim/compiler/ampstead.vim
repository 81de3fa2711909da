" :compiler ampstead, then :make lists the errors of the cell in the quickfix window.
if exists('current_compiler')
    finish
endif
let current_compiler = 'ampstead'
CompilerSet makeprg=ampstead\ check\ %:S
CompilerSet errorformat=%f:%l:%c:\ %trror:\ %m
