// The sentences of OpenQASM 3 and 2, a statement at a time: the entry rule is `statement`.
//
// Shaped for prediction by the next token or two (a test counts the exceptions; there are none): what begins
// with an expression (a call, a gate, an assignment) is one rule that branches after it, and operators come
// as a flat list whose precedence is applied when the tree is built.
parser grammar OpenQasm3Parser;

options {
  tokenVocab = OpenQasm3Lexer;
}

statement
  : annotation* (
      version
    | include
    | pragma
    | qubitDeclaration
    | creg
    | declaration
    | constant
    | inputOutput
    | alias
    | gate
    | opaque
    | subroutine
    | externDeclaration
    | expressionStatement
    | modifiedGate
    | measurement
    | resetStatement
    | barrier
    | nop
    | delay
    | box
    | ifElse
    | forLoop
    | whileLoop
    | switchCase
    | jump
    | returning
    | block
    | calibration
  )
  ;

annotation: ANNOTATION;

block: LEFT_BRACE statement* RIGHT_BRACE;

// What `if`, `else`, `for` and `while` govern: a block or one statement.
body: statement;

// The file and its parts

version: OPENQASM (REAL | INTEGER) SEMICOLON;

include: INCLUDE STRING SEMICOLON;

pragma: PRAGMA;

calibration
  : CAL CALIBRATION_HEAD? calibrationBody
  | DEFCAL CALIBRATION_HEAD calibrationBody
  | DEFCALGRAMMAR STRING SEMICOLON
  ;

calibrationBody: CALIBRATION_OPEN CALIBRATION_TEXT* CALIBRATION_CLOSE;

// Declarations

qubitDeclaration: QUBIT designator? IDENTIFIER SEMICOLON | QREG IDENTIFIER designator? SEMICOLON;

creg: CREG IDENTIFIER designator? SEMICOLON;

declaration: (scalarType | arrayType) IDENTIFIER (EQUALS value)? SEMICOLON;

constant: CONST (scalarType | arrayType) IDENTIFIER EQUALS value SEMICOLON;

inputOutput: (INPUT | OUTPUT) (scalarType | arrayType) IDENTIFIER SEMICOLON;

alias: LET IDENTIFIER EQUALS expression SEMICOLON;

gate: GATE IDENTIFIER (LEFT_PAREN names? RIGHT_PAREN)? names? block;

opaque: OPAQUE IDENTIFIER (LEFT_PAREN names? RIGHT_PAREN)? names SEMICOLON;

names: IDENTIFIER (COMMA IDENTIFIER)* COMMA?;

subroutine: DEF IDENTIFIER LEFT_PAREN parameters? RIGHT_PAREN result? block;

result: ARROW (scalarType | VOID);

parameters: parameter (COMMA parameter)* COMMA?;

parameter
  : scalarType IDENTIFIER
  | QUBIT designator? IDENTIFIER
  | (QREG | CREG) IDENTIFIER designator?
  | arrayReference IDENTIFIER
  ;

externDeclaration: EXTERN IDENTIFIER LEFT_PAREN externParameters? RIGHT_PAREN result? SEMICOLON;

externParameters: externParameter (COMMA externParameter)* COMMA?;

externParameter: scalarType | arrayReference | CREG designator?;

// Types

scalarType
  : (BIT | INT | UINT | FLOAT | ANGLE) designator?
  | BOOL
  | DURATION
  | STRETCH
  | COMPLEX (LEFT_BRACKET scalarType RIGHT_BRACKET)?
  ;

arrayType: ARRAY LEFT_BRACKET scalarType COMMA expressions RIGHT_BRACKET;

arrayReference
  : (READONLY | MUTABLE) ARRAY LEFT_BRACKET scalarType COMMA (expressions | DIM EQUALS expression) RIGHT_BRACKET
  ;

designator: LEFT_BRACKET expression RIGHT_BRACKET;

// Statements that begin with an expression: a gate or subroutine call, an assignment, a value

// They begin with a name, so that no statement can be taken for the rest of an expression before it.
expressionStatement
  : nameTerm (binaryOperator term)* (operands | (EQUALS | COMPOUND_ASSIGNMENT) value)? SEMICOLON
  ;

modifiedGate: modifier+ nameTerm operands? SEMICOLON;

nameTerm: (IDENTIFIER | GPHASE) arguments? index*;

modifier: (INV | POW parenthesized | (CTRL | NEGCTRL) parenthesized?) AT;

operands: operand (COMMA operand)* COMMA?;

operand: (IDENTIFIER | HARDWARE_QUBIT) index*;

// Other quantum statements

measurement: measure (ARROW operand)? SEMICOLON;

measure: MEASURE operand;

resetStatement: RESET operand SEMICOLON;

barrier: BARRIER operands? SEMICOLON;

nop: NOP operands? SEMICOLON;

delay: DELAY designator operands? SEMICOLON;

box: BOX designator? block;

// Control

// An `else` belongs to the nearest `if`. Said as a condition on not taking one, or the rule would be ambiguous.
ifElse: IF parenthesized body (ELSE body | {_input->LA(1) != ELSE}?);

forLoop: FOR scalarType IDENTIFIER IN (LEFT_BRACKET range RIGHT_BRACKET | set | expression) body;

whileLoop: WHILE parenthesized body;

switchCase: SWITCH parenthesized LEFT_BRACE switchItem* RIGHT_BRACE;

switchItem: CASE expressions block | DEFAULT block;

jump: (BREAK | CONTINUE | END) SEMICOLON;

returning: RETURN value? SEMICOLON;

// Expressions

// What may stand after `=` and `return`. With operands: the result of a defcal.
value: expression operands? | set | measure;

expression: term (binaryOperator term)*;

binaryOperator
  : POWER | TIMES | DIVIDE | REMAINDER | PLUS | MINUS | SHIFT_LEFT | SHIFT_RIGHT
  | LESS | LESS_EQUAL | GREATER | GREATER_EQUAL | EQUAL | NOT_EQUAL
  | BIT_AND | BIT_XOR | BIT_OR | LOGICAL_AND | LOGICAL_OR | CONCATENATE
  ;

term: (MINUS | LOGICAL_NOT | BIT_NOT)* primary index*;

primary
  : IDENTIFIER arguments?
  | POW arguments  // a function up to 3.1
  | INTEGER
  | REAL
  | IMAGINARY
  | TIMING
  | TRUE
  | FALSE
  | STRING
  | HARDWARE_QUBIT
  | parenthesized
  | scalarType parenthesized
  | DURATIONOF LEFT_PAREN block RIGHT_PAREN
  ;

parenthesized: LEFT_PAREN expression RIGHT_PAREN;

arguments: LEFT_PAREN expressions? RIGHT_PAREN;

expressions: expression (COMMA expression)* COMMA?;

set: LEFT_BRACE (element (COMMA element)* COMMA?)? RIGHT_BRACE;

element: expression | set;

index: LEFT_BRACKET (set | indexItem (COMMA indexItem)* COMMA?) RIGHT_BRACKET;

indexItem: expression (COLON rangeRest)? | COLON rangeRest;

range: expression? COLON rangeRest;

// After the first colon of first:last or first:step:last.
rangeRest: expression? (COLON expression?)?;
