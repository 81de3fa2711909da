" Syntax of cells and process files of ampstead.
if exists('b:current_syntax')
    finish
endif

syntax case match
syntax match ampsteadComment /#.*$/ contains=@Spell
syntax region ampsteadText start=/"/ end=/"/ oneline
" Numbers with prefix and unit, IEC 60062 letters inside the digits too.
syntax match ampsteadNumber /\<\d\+\(\.\d\+\)\?\([eE][-+]\?\d\+\)\?\( \?\(%\|\(ppm\|[fpnuµmkMGT]\?\(ohm\|Ω\|[VAWSKCm]\)\|[fpnuµmkMGT]\)\>\(\s*=\)\@!\)\)\?/
syntax match ampsteadNumber /\<\d\+[fpnuµmkKMGTR]\d\+\>/
syntax match ampsteadKey /\<\w\+\ze\s*[+*]\?=/
syntax match ampsteadArrow /->/
syntax match ampsteadQuantity /\<\h\w*\(\.\w\+\)\+\>/

" Words are statements only at the start of a line.
syntax match ampsteadStatement /^\s*\zs\(title\|process\|let\|temperature\|measured_at\|valid\|model\|corner\|block\|use\|end\|output\|sweep\|hand\|require\|vary\|choose\|quiet\)\>/
syntax match ampsteadPart /^\s*\zs\(rail\|resistor\|current\|voltage\|diode\|nmos\|pmos\|npn\|pnp\|njfet\|pjfet\|opamp\|law\|table\)\>/
syntax keyword ampsteadPhrase from to at within of below above points show everywhere for so
syntax keyword ampsteadFunction sqrt ln log10 exp min max abs
syntax keyword ampsteadConstant pi thermal_voltage gnd none

highlight default link ampsteadComment Comment
highlight default link ampsteadText String
highlight default link ampsteadNumber Number
highlight default link ampsteadKey Identifier
highlight default link ampsteadArrow Operator
highlight default link ampsteadQuantity Identifier
highlight default link ampsteadStatement Statement
highlight default link ampsteadPart Type
highlight default link ampsteadPhrase Keyword
highlight default link ampsteadFunction Function
highlight default link ampsteadConstant Constant

let b:current_syntax = 'ampstead'
setlocal commentstring=#\ %s
