" Colours for crenate without a language server; Vim and Neovim.
if exists('b:current_syntax')
  finish
endif

syntax match   crenateComment   "#.*$" contains=@Spell
syntax region  crenateString    start=+"+ end=+"+ oneline contains=@Spell
syntax match   crenateNumber    "\v<\d+(\.\d*)?([eE][-+]?\d+)?|\.\d+([eE][-+]?\d+)?"
syntax match   crenateUnit      "\v(\d\.?\s*)@<=(nm|meV|eV|me|angstrom|Å|Å|um|µm|μm|pm|mm|cm|m|bohr|J|ueV|neV|keV|Ry|Ha|u|kg|g|K|mK|uK|nK|s|ms|us|ns|ps|fs|Hz|kHz|MHz|GHz|THz|rad|deg|Er|ML|\%)>?"
syntax keyword crenateClause    of at to by and in within between phase sigma width size radius angle angles axis like because times star curve
syntax keyword crenateChoice    fermions bosons line spline direct indirect closed metal semimetal semiconductor insulator
syntax match   crenateStatement "\v^\s*(use|let|waive|mass|edge|monolayer|nonparabolic|rate|source|title|degeneracy|carriers|filling|temperature|recoil|bands|lattice|layer|stack|delta|profile|table|cosine|depth|fourier|site|atom|formfactor|measure|require)>"
syntax match   crenateHeading   "\v^\s*(material|crystal)>" nextgroup=crenateName skipwhite
syntax match   crenateName      "\v\k+" contained
syntax keyword crenateQuantity  gap bottom top level hopping fermi
syntax match   crenateOperator  "\v\>\=|\<\=|±|\+/-|[-+*/^=<>]"

highlight default link crenateComment   Comment
highlight default link crenateString    String
highlight default link crenateNumber    Number
highlight default link crenateUnit      Type
highlight default link crenateClause    Keyword
highlight default link crenateChoice    Constant
highlight default link crenateStatement Statement
highlight default link crenateHeading   Structure
highlight default link crenateName      Identifier
highlight default link crenateQuantity  Function
highlight default link crenateOperator  Operator

let b:current_syntax = 'crenate'
