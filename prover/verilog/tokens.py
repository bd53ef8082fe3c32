"""Expanded text to tokens, one list a module.

The lexer takes the place of pyverilog's: one regular expression, the whole list of reserved words, and the
numbers, operators and SystemVerilog pieces that pyverilog's tokens lack. A token's `lineno` is its offset in
the expanded text, so that every node of the tree carries an offset for its line number, and with it a column.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator
from dataclasses import dataclass
from typing import Any

from ply.lex import LexToken
from pyverilog.vparser.lexer import VerilogLexer

from prover.errors import UserError
from prover.verilog.names import words
from prover.verilog.source import Source, printable

# Reserved words that the grammar knows, by the standard that reserves them.
VERILOG_WORDS = words(
    """always and assign automatic begin buf bufif0 bufif1 case casex casez deassign default defparam
    disable edge else end endcase endfunction endgenerate endmodule endprimitive endtask event for
    force forever fork function generate genvar if initial inout input integer join localparam
    module macromodule nand negedge nor not notif0 notif1 or output parameter posedge primitive real
    realtime reg release repeat signed supply0 supply1 table task time tri tri0 tri1 triand trior
    trireg unsigned wait wand while wire wor xnor xor"""
)
SYSTEM_WORDS = words(
    """always_comb always_ff always_latch bit byte enum int logic longint packed priority return
    shortint static typedef unique unique0 var void"""
)
# Reserved, and nothing that a divider needs.
REFUSED_WORDS = words(
    """cell cmos config design endconfig endspecify endtable highz0 highz1 ifnone incdir include
    instance large liblist library medium nmos noshowcancelled pmos pull0 pull1 pulldown pullup
    pulsestyle_ondetect pulsestyle_onevent rcmos rnmos rpmos rtran rtranif0 rtranif1 scalared
    showcancelled small specify specparam strong0 strong1 tran tranif0 tranif1 use uwire vectored
    weak0 weak1"""
)

OPERATORS = {
    "<<<=": "ASSIGNOP", ">>>=": "ASSIGNOP", "<<=": "ASSIGNOP", ">>=": "ASSIGNOP", "===": "EQL", "!==": "NEL",
    "<<<": "LSHIFTA", ">>>": "RSHIFTA", "&&&": "REFUSED", "**": "POWER", "&&": "LAND", "||": "LOR",
    "~&": "NAND", "~|": "NOR", "~^": "XNOR", "^~": "XNOR", "==": "EQ", "!=": "NE", "<=": "LE", ">=": "GE",
    "<<": "LSHIFT", ">>": "RSHIFT", "+:": "PLUSCOLON", "-:": "MINUSCOLON", "++": "INCREMENT",
    "--": "INCREMENT", "+=": "ASSIGNOP", "-=": "ASSIGNOP", "*=": "ASSIGNOP", "/=": "ASSIGNOP",
    "%=": "ASSIGNOP", "&=": "ASSIGNOP", "|=": "ASSIGNOP", "^=": "ASSIGNOP", "->": "TRIGGER", "+": "PLUS",
    "-": "MINUS", "*": "TIMES", "/": "DIVIDE", "%": "MOD", "~": "NOT", "|": "OR", "&": "AND", "^": "XOR",
    "!": "LNOT", "<": "LT", ">": "GT", "?": "COND", "=": "EQUALS", "@": "AT", ",": "COMMA", ":": "COLON",
    ";": "SEMICOLON", ".": "DOT", "(": "LPAREN", ")": "RPAREN", "[": "LBRACKET", "]": "RBRACKET",
    "{": "LBRACE", "}": "RBRACE", "#": "DELAY", "'": "TICK",
}  # fmt: skip

GATES = words("""and nand nor xor xnor buf not bufif0 bufif1 notif0 notif1""")
_NETS = words("""tri0 tri1 triand trior trireg wand wor realtime event""")

_LEXEME = re.compile(
    r"""(?P<space>\s+)
      | (?P<attribute>\(\*(?!\s*\)))
      | (?P<string>"(?:[^"\\\n]|\\.)*")
      | (?P<float>[0-9][0-9_]*(?:\.[0-9][0-9_]*(?:[eE][-+]?[0-9][0-9_]*)?|[eE][-+]?[0-9][0-9_]*))
      | (?P<based>'[sS]?(?:[bBoOhH]\s*[0-9a-zA-Z_?]+|[dD]\s*(?:[0-9a-zA-Z_]+|\?_*)))
      | (?P<fill>'[01xXzZ](?![\w']))
      | (?P<number>[0-9][0-9_]*)
      | (?P<system>\$[\w$]+)
      | (?P<word>[A-Za-z_][\w$]*|\\[!-~]+)
      | (?P<operator>""" + "|".join(map(re.escape, OPERATORS)) + r""")""",
    re.VERBOSE | re.ASCII | re.DOTALL,
)  # fmt: skip
_ATTRIBUTE_END = re.compile(r'(?:"(?:[^"\\\n]|\\.)*"|[^"*]|\*(?!\)))*\*\)', re.DOTALL)


@dataclass(frozen=True, slots=True)
class Chunk:
    """The tokens of one module or primitive, before they are parsed; `portless` marks a test bench."""

    name: str
    tokens: list[Any]
    portless: bool
    offset: int


class Lexer(VerilogLexer):  # type: ignore[misc]
    """Hands a list of tokens to the parser. PLY reads `lineno` and `lexpos` from its lexer as well."""

    tokens = tuple(
        sorted(
            {word.upper() for word in VERILOG_WORDS | SYSTEM_WORDS} - {g.upper() for g in GATES}
            - {w.upper() for w in _NETS} - {"OR", "MACROMODULE", "TABLE", "UNIQUE0", "PACKED", "EDGE"}
            | set(OPERATORS.values())
            | {"SENS_OR", "GATE", "NETTYPE", "TYPENAME", "ID", "NUMBER", "BASED", "FILL", "FLOATNUMBER"}
            | {"STRING_LITERAL", "SYSTEM", "TABLETEXT", "RESERVED"}
        )
    )  # fmt: skip

    def __init__(self) -> None:
        self.lineno = self.lexpos = 0
        self._rest: Iterator[Any] = iter(())

    def input(self, data: list[Any]) -> None:
        self._rest = iter(data)

    def token(self) -> Any:
        token = next(self._rest, None)
        if token is not None:
            self.lineno = token.lineno
        return token


def _token(kind: str, value: str, offset: int) -> Any:
    token = LexToken()
    token.type, token.value, token.lineno, token.lexpos = kind, value, offset, offset
    return token


def _word(value: str) -> str:
    """The kind of token that an unescaped word is."""
    if value == "or":
        return "SENS_OR"
    if value in GATES:
        return "GATE"
    if value in _NETS:
        return "NETTYPE"
    if value == "macromodule":
        return "MODULE"
    if value == "unique0":
        return "UNIQUE"
    if value in VERILOG_WORDS or value in SYSTEM_WORDS:
        return value.upper() if value not in ("packed", "edge") else "RESERVED"
    return "RESERVED" if value in REFUSED_WORDS else "ID"


def _identifier(value: str) -> str:
    """An escaped name that needs no escape is the plain name (clause 3.7.1)."""
    return value[1:] if re.fullmatch(r"\\[A-Za-z_][\w$]*", value, re.ASCII) else value


def tokenize(source: Source, notes: list[tuple[str, int]]) -> list[Any]:
    """All tokens of the text, attributes, specify blocks and assertions left out; what is left out is noted."""
    text, position, out = source.text, 0, []
    while position < len(text):
        found = _LEXEME.match(text, position)
        if not found:
            where = source.where(position)
            shown = printable(text[position])
            raise UserError(
                f"character {shown!r} has no place in Verilog", where, "remove it, or put it in a comment"
            )
        kind, value, start = found.lastgroup, found.group(), position
        position = found.end()
        if kind == "space":
            continue
        if kind == "attribute":
            end = _ATTRIBUTE_END.match(text, position)
            if not end:
                raise UserError("this attribute never ends", source.where(start), "close it with *)")
            position = end.end()
        elif kind == "word" and value == "specify":
            end = re.compile(r"\bendspecify\b").search(text, position)
            if not end:
                raise UserError("specify without endspecify", source.where(start), "close it with endspecify")
            notes.append(("specify block passed over: it holds delays only", start))
            position = end.end()
        elif kind == "word" and value in ("timeunit", "timeprecision"):
            position = text.find(";", position) + 1 or len(text)
        elif kind == "word" and value == "table":
            end = re.compile(r"\bendtable\b").search(text, position)
            if not end:
                raise UserError("table without endtable", source.where(start), "close it with endtable")
            out.append(_token("TABLETEXT", text[position : end.start()], position))
            position = end.end()
        else:
            out.append(_classified(kind or "", value, start, out))
    return without_assertions(out, notes)


_CLAIMS = frozenset({"assert", "assume", "cover", "restrict"})
MAX_PARENTHESES = 100
_BEFORE_STATEMENT = frozenset({"SEMICOLON", "BEGIN", "END", "ELSE", "RPAREN", "ENDGENERATE"})


def without_assertions(tokens: list[Any], notes: list[tuple[str, int]]) -> list[Any]:
    """The tokens with assertions, and the properties and sequences that these name, left out and noted.

    They say what should hold and make no hardware. What is no assertion, such as a task of that name, stays."""
    names = [t.value if t.type == "ID" else "" for t in tokens]
    if not any(name in _CLAIMS or name in ("property", "sequence") for name in names):
        return tokens
    own = {name for name, before in zip(names[1:], tokens, strict=False) if before.type in ("TASK", "MODULE")}
    out: list[Any] = []
    position = 0
    while position < len(tokens):
        end = None
        if names[position] and names[position] not in own:
            end = _assertion_end(tokens, names, position, out[-1].type if out else "")
        if end is None:
            out.append(tokens[position])
            position += 1
            continue
        if end > len(tokens):
            # What never ends is no assertion, and neither is anything in it.
            return out + tokens[position:]
        notes.append(("assertion passed over: it makes no hardware", tokens[position].lineno))
        labelled = [t.type for t in out[-2:]] == ["ID", "COLON"] and out[-3].type in _BEFORE_STATEMENT
        if labelled and names[position + 1] in ("property", "sequence"):
            # Inside a process it could be the label of a case.
            del out[-2:]
        out.append(_token("SEMICOLON", ";", tokens[position].lineno))
        position = end
    return out


def _assertion_end(tokens: list[Any], names: list[str], start: int, before: str) -> int | None:
    """Where the assertion, property or sequence that starts here has ended, beyond the last token if it never does;
    None if none starts here. `before` is the kind of the token that is left before it."""
    never = len(tokens) + 1

    def after(kinds: Collection[str], position: int) -> int:
        found = (i for i in range(position, len(tokens)) if tokens[i].type in kinds)
        return next(found, never - 1) + 1

    def is_at(position: int, kind: str) -> bool:
        return position < len(tokens) and tokens[position].type == kind

    if names[start] in ("property", "sequence") and before in _BEFORE_STATEMENT:
        close = "end" + names[start]
        end = next((i + 1 for i in range(start, len(tokens)) if names[i] == close), never)
        return _skip_label(tokens, end)
    if names[start] not in _CLAIMS or before not in _BEFORE_STATEMENT | {"COLON"}:
        return None
    end = start + 1 + (names[start + 1 : start + 2] in (["property"], ["sequence"]))
    if not is_at(end, "LPAREN"):
        return None
    depth, end = 1, end + 1
    while depth:
        end = after(("LPAREN", "RPAREN"), end)
        if end == never or depth > MAX_PARENTHESES:
            return never
        depth += 1 if tokens[end - 1].type == "LPAREN" else -1
    # An action is a system task, or two with an else between.
    if is_at(end, "SYSTEM"):
        end = after(("SEMICOLON",), end)
        if not is_at(end, "ELSE"):
            return end
    if is_at(end, "ELSE"):
        return after(("SEMICOLON",), end) if is_at(end + 1, "SYSTEM") else None
    return end + 1 if is_at(end, "SEMICOLON") else None


def _classified(kind: str, value: str, start: int, before: list[Any]) -> Any:
    if kind == "word":
        if value.startswith("\\"):
            return _token("ID", _identifier(value), start)
        return _token(_word(value), value, start)
    if kind == "operator":
        return _token(OPERATORS[value], value, start)
    if kind == "based":
        # `4 'd3` is one number, but in `#4 'd3` the 4 is a delay.
        sized = (
            before and before[-1].type == "NUMBER" and not (len(before) > 1 and before[-2].type == "DELAY")
        )
        if sized:
            size = before.pop()
            return _token("BASED", size.value + value, size.lineno)
        return _token("BASED", value, start)
    names = {"string": "STRING_LITERAL", "float": "FLOATNUMBER", "fill": "FILL", "number": "NUMBER"}
    return _token(names.get(kind, "SYSTEM"), value, start)


def chunks(source: Source, tokens: list[Any]) -> list[Chunk]:
    """The tokens cut at `endmodule` and `endprimitive`; anything between modules but types is an error."""
    out: list[Chunk] = []
    shared: list[Any] = []
    position = 0
    while position < len(tokens):
        first = tokens[position]
        if first.type == "TYPEDEF" or first.type in ("PARAMETER", "LOCALPARAM"):
            end = position
            while end < len(tokens) and tokens[end].type != "SEMICOLON":
                end += 1
            shared += tokens[position : end + 1]
            position = end + 1
        elif first.type == "SEMICOLON":
            position += 1
        elif first.type in ("MODULE", "PRIMITIVE"):
            end = position + 1
            while end < len(tokens) and tokens[end].type not in ("ENDMODULE", "ENDPRIMITIVE"):
                if tokens[end].type in ("MODULE", "PRIMITIVE"):
                    raise UserError(
                        f"{tokens[end].value} inside a {first.value}",
                        source.where(tokens[end].lineno),
                        f"close the {first.value} with end{first.value}",
                    )
                end += 1
            if end >= len(tokens):
                raise UserError(
                    f"syntax error: {first.value} without end{first.value}",
                    source.where(first.lineno),
                    "is an end missing before it?",
                )
            body = tokens[position : end + 1]
            position = _skip_label(tokens, end + 1)
            out.append(_chunk(source, body, shared))
        else:
            raise UserError(
                f"{printable(first.value)!r} stands outside a module",
                source.where(first.lineno),
                "leave only modules, primitives, parameters and typedefs there",
            )
    return out


def _skip_label(tokens: list[Any], position: int) -> int:
    following = [t.type for t in tokens[position : position + 2]]
    return position + 2 if following == ["COLON", "ID"] else position


def _chunk(source: Source, body: list[Any], shared: list[Any]) -> Chunk:
    if len(body) < 2 or body[1].type != "ID":
        raise UserError("a module without a name", source.where(body[0].lineno), "write module NAME")
    kinds = [t.type for t in body[2:5]]
    portless = kinds[:1] == ["SEMICOLON"] or kinds[:3] == ["LPAREN", "RPAREN", "SEMICOLON"]
    header = next((i for i, t in enumerate(body) if t.type == "SEMICOLON"), 0)
    tokens = body[: header + 1] + shared + body[header + 1 :]
    return Chunk(body[1].value, tokens, portless and body[0].type == "MODULE", body[0].lineno)


def plain(tokens: list[Any]) -> list[Any]:
    """The tokens with the words that only SystemVerilog reserves taken as names."""
    words = {word.upper() for word in SYSTEM_WORDS} | {"RESERVED"}
    return [
        _token("ID", t.value, t.lineno) if t.type in words and t.value in SYSTEM_WORDS else t for t in tokens
    ]


def tidy(source: Source, tokens: list[Any]) -> list[Any]:
    """The tokens with end labels checked and dropped, and the names of types told from other names."""
    types = _type_names(tokens)
    out: list[Any] = []
    open_labels: list[str | None] = []
    position = 0
    while position < len(tokens):
        token = tokens[position]
        position += 1
        if token.type == "ID" and token.value in types and token.lineno > types[token.value]:
            token = _token("TYPENAME", token.value, token.lineno)
        out.append(token)
        if token.type in ("BEGIN", "FUNCTION", "TASK", "GENERATE", "FORK"):
            open_labels.append(_label(tokens, position) if token.type == "BEGIN" else None)
        elif token.type in ("END", "ENDFUNCTION", "ENDTASK", "ENDGENERATE", "JOIN"):
            opened = open_labels.pop() if open_labels else None
            closing = _label(tokens, position)
            if closing is None:
                continue
            if token.type == "END" and closing != opened:
                raise UserError(
                    f"this block ends as {printable(closing)} but doesn't begin so",
                    source.where(token.lineno),
                    f"write begin : {printable(closing)}",
                )
            position += 2
    return out


def _label(tokens: list[Any], position: int) -> str | None:
    if position + 1 < len(tokens) and tokens[position].type == "COLON" and tokens[position + 1].type == "ID":
        return str(tokens[position + 1].value)
    return None


def _type_names(tokens: list[Any]) -> dict[str, int]:
    """Names that a typedef declares, and where; the name is the last one before the semicolon."""
    found: dict[str, int] = {}
    for i, token in enumerate(tokens):
        if token.type == "TYPEDEF":
            end = i
            while end < len(tokens) and tokens[end].type != "SEMICOLON":
                end += 1
            if end < len(tokens) and tokens[end - 1].type == "ID":
                found[tokens[end - 1].value] = tokens[end - 1].lineno
    return found
