// The words of OpenQASM 3 and 2.
//
// Every character of any text belongs to some token: what is malformed (a number that runs into letters, a
// string or comment without an end, a stray character) has tokens of its own, so that the parser meets it
// where it stands and the reader hears about it in plain words.
//
// Three things need more than a lexer rule and are done where tokens are fetched (compiler/language/tokens.h):
// whether `@` opens an annotation or ends a modifier, which words are reserved in which version, and that a
// text between quotes is a bit string in an expression but a path after `include`.
lexer grammar OpenQasm3Lexer;

// An `@` and the rest of its line, where it opens an annotation.
tokens { ANNOTATION }

// The file and its parts
OPENQASM: 'OPENQASM';
INCLUDE: 'include';
GATE: 'gate';
OPAQUE: 'opaque';
DEF: 'def';
EXTERN: 'extern';
DEFCALGRAMMAR: 'defcalgrammar';
DEFCAL: 'defcal' -> pushMode(CALIBRATION);
CAL: 'cal' -> pushMode(CALIBRATION);

// Control
IF: 'if';
ELSE: 'else';
FOR: 'for';
IN: 'in';
WHILE: 'while';
SWITCH: 'switch';
CASE: 'case';
DEFAULT: 'default';
BREAK: 'break';
CONTINUE: 'continue';
END: 'end';
RETURN: 'return';

// Declarations
LET: 'let';
INPUT: 'input';
OUTPUT: 'output';
CONST: 'const';
READONLY: 'readonly';
MUTABLE: 'mutable';
DIM: '#dim';

// Types
QUBIT: 'qubit';
QREG: 'qreg';
CREG: 'creg';
BIT: 'bit';
BOOL: 'bool';
INT: 'int';
UINT: 'uint';
FLOAT: 'float';
ANGLE: 'angle';
COMPLEX: 'complex';
ARRAY: 'array';
VOID: 'void';
DURATION: 'duration';
STRETCH: 'stretch';

// Quantum operations
GPHASE: 'gphase';
INV: 'inv';
POW: 'pow';
CTRL: 'ctrl';
NEGCTRL: 'negctrl';
MEASURE: 'measure';
RESET: 'reset';
BARRIER: 'barrier';
DELAY: 'delay';
BOX: 'box';
NOP: 'nop';
DURATIONOF: 'durationof';

// Literals that are words
TRUE: 'true';
FALSE: 'false';
IM: 'im';

// Lines kept as they are. The text of a pragma begins with something that cannot continue a name.
PRAGMA: '#'? 'pragma' (~[\p{L}\p{Nl}0-9_\r\n] ~[\r\n]*)?;

// Signs
LEFT_BRACE: '{';
RIGHT_BRACE: '}';
LEFT_BRACKET: '[';
RIGHT_BRACKET: ']';
LEFT_PAREN: '(';
RIGHT_PAREN: ')';
COLON: ':';
SEMICOLON: ';';
COMMA: ',';
ARROW: '->';
AT: '@';
EQUALS: '=';
COMPOUND_ASSIGNMENT: '+=' | '-=' | '*=' | '/=' | '%=' | '**=' | '&=' | '|=' | '^=' | '<<=' | '>>=';

CONCATENATE: '++';
PLUS: '+';
MINUS: '-';
POWER: '**';
TIMES: '*';
DIVIDE: '/';
REMAINDER: '%';
SHIFT_LEFT: '<<';
SHIFT_RIGHT: '>>';
LESS: '<';
LESS_EQUAL: '<=';
GREATER: '>';
GREATER_EQUAL: '>=';
EQUAL: '==';
NOT_EQUAL: '!=';
BIT_AND: '&';
BIT_XOR: '^';
BIT_OR: '|';
BIT_NOT: '~';
LOGICAL_AND: '&&';
LOGICAL_OR: '||';
LOGICAL_NOT: '!';

// Numbers
INTEGER: DECIMAL | '0' [xX] HEX ('_'? HEX)* | '0o' [0-7] ('_'? [0-7])* | '0' [bB] [01] ('_'? [01])*;
REAL: POINTED EXPONENT? | DECIMAL EXPONENT;
TIMING: (DECIMAL | REAL) [ \t]* ('ns' | 'us' | '\u00B5s' | '\u03BCs' | 'ms' | 's' | 'dt');
IMAGINARY: (DECIMAL | REAL) [ \t]* 'im';

fragment DECIMAL: [0-9] ('_'? [0-9])*;
fragment POINTED: DECIMAL '.' DECIMAL? | '.' DECIMAL;
fragment EXPONENT: [eE] [+-]? DECIMAL;
fragment HEX: [0-9a-fA-F];

// The longest match wins, so this is what is left: `3x`, `3__4`, `12af`, `1.5z`.
BAD_NUMBER: (DECIMAL | REAL) NAME_PART+;

HARDWARE_QUBIT: '$' [0-9]+;
IDENTIFIER: NAME_START NAME_PART*;

fragment NAME_START: [_\p{Lu}\p{Ll}\p{Lt}\p{Lm}\p{Lo}\p{Nl}];
fragment NAME_PART: [_0-9\p{Lu}\p{Ll}\p{Lt}\p{Lm}\p{Lo}\p{Nl}];

STRING: '"' ~["\r\n]* '"' | '\'' ~['\r\n]* '\'';
OPEN_STRING: '"' ~["\r\n]* | '\'' ~['\r\n]*;

// Between tokens
BLANKS: [ \t\r\n]+ -> skip;
LINE_COMMENT: '//' ~[\n]* -> skip;
BLOCK_COMMENT: '/*' .*? '*/' -> skip;
OPEN_COMMENT: '/*' (~[*] | '*'+ ~[*/])* '*'* EOF;
STRAY_COMMENT_END: '*/';

UNKNOWN: .;

// From `cal` or `defcal` to the closing brace: kept as text. Only braces are counted.
mode CALIBRATION;
CALIBRATION_HEAD: ~[{};]+;
CALIBRATION_SEMICOLON: ';' -> type(SEMICOLON), popMode;
CALIBRATION_STRAY_BRACE: '}' -> type(RIGHT_BRACE), popMode;
CALIBRATION_OPEN: '{' -> mode(CALIBRATION_BODY);

mode CALIBRATION_BODY;
CALIBRATION_TEXT: ~[{}]+;
CALIBRATION_NESTED: '{' -> type(CALIBRATION_TEXT), pushMode(CALIBRATION_NEST);
CALIBRATION_CLOSE: '}' -> popMode;

mode CALIBRATION_NEST;
NESTED_TEXT: ~[{}]+ -> type(CALIBRATION_TEXT);
NESTED_OPEN: '{' -> type(CALIBRATION_TEXT), pushMode(CALIBRATION_NEST);
NESTED_CLOSE: '}' -> type(CALIBRATION_TEXT), popMode;
