"""pyverilog's grammar, taught the rest of Verilog-2005 and some SystemVerilog.

Expressions, ifs and cases are pyverilog's own productions, listed in `INHERITED`. Its declarations, ports,
instances, statements and generate constructs lose or misread too much (`signed` on later names, `a[i -: 4]`,
initial values, `always #5`, empty statements) and are replaced by the productions below, which keep what
they read and leave the judgement to elaboration. A method's docstring is its production, as PLY wants it.
"""

from __future__ import annotations

from typing import Any

from pyverilog.vparser import ast as vast
from pyverilog.vparser.parser import VerilogParser

from prover.verilog import tree
from prover.verilog.names import words
from prover.verilog.tokens import Lexer

INHERITED = words(
    """expression_uminus expression_uplus expression_ulnot expression_unot expression_uand
    expression_unand expression_unor expression_uor expression_uxor expression_uxnor
    expression_power expression_times expression_div expression_mod expression_plus expression_minus
    expression_sll expression_srl expression_sla expression_sra expression_lessthan
    expression_greaterthan expression_lesseq expression_greatereq expression_eq expression_noteq
    expression_eql expression_noteql expression_And expression_Xor expression_Xnor expression_Or
    expression_land expression_lor expression_cond expression_expr expression_concat
    expression_repeat expression_partselect expression_pointer expression_functioncall
    expression_systemcall expression_id expression_const concat concatlist concatlist_one repeat
    partselect partselect_pointer pointer pointer_pointer const_expression_intnum
    const_expression_floatnum const_expression_stringliteral floatnumber stringliteral functioncall
    func_args func_args_one func_args_empty identifier scope_identifier scope scope_pointer
    if_statement if_statement_woelse cond ifcontent_statement true_statement else_statement
    case_statement casex_statement casez_statement case_comp casecontent_statement
    casecontent_condition_single casecontent_condition_one casecontent_statement_default initial
    initial_statement while_statement whilecontent_statement empty"""
)


class Grammar(VerilogParser):  # type: ignore[misc]
    """The productions. Tables are made and loaded in `parse`."""

    start = "definition"
    tokens = Lexer.tokens
    # The conditional operator is the weakest and groups to the right (clause 5.1.2).
    precedence = (("right", "COND", "COLON"), *VerilogParser.precedence)

    def __init__(self) -> None:
        self.lexer = Lexer()

    # -- modules -------------------------------------------------------------------------------------------

    def p_definition(self, p: Any) -> None:
        """definition : moduledef
        | primitivedef"""
        p[0] = p[1]

    def p_moduledef(self, p: Any) -> None:
        "moduledef : MODULE ID paramlist portlist items ENDMODULE"
        p[0] = tree.Module(p[2], p[3], p[4], p[5], p.lineno(2))

    def p_primitivedef(self, p: Any) -> None:
        "primitivedef : PRIMITIVE ID LPAREN portitems RPAREN SEMICOLON items TABLETEXT ENDPRIMITIVE"
        p[0] = tree.Primitive(p[2], p[4], p[7], p[8], p.lineno(8), p.lineno(2))

    def p_append(self, p: Any) -> None:
        """items : items item
        block_items : block_items block_item
        casecontent_statements : casecontent_statements casecontent_statement
        generate_arms : generate_arms generate_arm
        sigtypes : sigtypes sigtype
        widths : widths width
        dimensions : dimensions dimension"""
        p[1].append(p[2])
        p[0] = p[1]

    def p_append_after_comma(self, p: Any) -> None:
        """portitems : portitems COMMA portitem
        headerparams : headerparams COMMA headerparam
        names : names COMMA name
        assigns : assigns COMMA assign_pair
        instances : instances COMMA instance_body
        port_args : port_args COMMA port_arg
        events : events event_separator event
        defparams : defparams COMMA defparam
        enum_members : enum_members COMMA enum_member
        sysargs : sysargs COMMA sysarg
        lvalues : lvalues COMMA lvalue
        expressions : expressions COMMA expression"""
        p[1].append(p[3])
        p[0] = p[1]

    def p_first(self, p: Any) -> None:
        """casecontent_statements : casecontent_statement
        generate_arms : generate_arm
        sigtypes : sigtype
        widths : width
        dimensions : dimension
        portitems : portitem
        headerparams : headerparam
        names : name
        assigns : assign_pair
        instances : instance_body
        port_args : port_arg
        events : event
        defparams : defparam
        enum_members : enum_member
        sysargs : sysarg
        lvalues : lvalue
        expressions : expression"""
        p[0] = [p[1]]

    def p_none(self, p: Any) -> None:
        """items : empty
        block_items : empty
        paramlist : empty
        optional_dimensions : empty"""
        p[0] = []

    def p_pass(self, p: Any) -> None:
        """optional_dimensions : dimensions
        optional_type : type
        sysarg : expression
        optional_delay : delay
        item : declaration
        | typedef
        | parameterdecl
        | gates
        | instance
        | subroutine
        | initial
        | generate_if
        | generate_for
        | generate_case
        | generate_block
        block_item : declaration
        | parameterdecl
        | basic_statement
        basic_statement : if_statement
        | case_statement
        | casex_statement
        | casez_statement
        | while_statement
        | block
        expression : fill
        | cast
        | indexed
        lvalue : identifier
        | pointer
        | partselect
        | indexed"""
        p[0] = p[1]

    def p_absent(self, p: Any) -> None:
        """optional_type : empty
        optional_delay : empty
        sysarg : empty
        for_condition : empty
        for_step : empty"""
        p[0] = None

    # -- parameters and ports ------------------------------------------------------------------------------

    def p_paramlist(self, p: Any) -> None:
        """paramlist : DELAY LPAREN headerparams RPAREN
        | DELAY LPAREN RPAREN"""
        p[0] = p[3] if len(p) == 5 else []

    def p_headerparam(self, p: Any) -> None:
        """headerparam : paramkind optional_type name
        | type name
        | name"""
        local = p[1] == "localparam"
        kind = p[len(p) - 2] if len(p) > 2 else None
        # A name alone goes on with the kind and type of the one before: (parameter [3:0] A = 1, B = 2).
        p[0] = tree.Parameters(local, kind, [p[len(p) - 1]], p.lineno(1) if len(p) > 2 else -1)

    def p_paramkind(self, p: Any) -> None:
        """paramkind : PARAMETER
        | LOCALPARAM"""
        p[0] = p[1]

    def p_parameterdecl(self, p: Any) -> None:
        "parameterdecl : paramkind optional_type names SEMICOLON"
        p[0] = tree.Parameters(p[1] == "localparam", p[2], p[3], p.lineno(1))

    def p_portlist(self, p: Any) -> None:
        """portlist : LPAREN portitems RPAREN SEMICOLON
        | LPAREN RPAREN SEMICOLON
        | SEMICOLON"""
        p[0] = p[2] if len(p) == 5 else []

    def p_portitem(self, p: Any) -> None:
        """portitem : type name
        | name"""
        p[0] = tree.PortItem(p[1] if len(p) == 3 else None, p[len(p) - 1], p.lineno(len(p) - 1))

    # -- declarations --------------------------------------------------------------------------------------

    def p_sigtype(self, p: Any) -> None:
        """sigtype : INPUT
        | OUTPUT
        | INOUT
        | WIRE
        | TRI
        | NETTYPE
        | SUPPLY0
        | SUPPLY1
        | REG
        | LOGIC
        | SIGNED
        | UNSIGNED
        | INTEGER
        | TIME
        | REAL
        | INT
        | BIT
        | BYTE
        | SHORTINT
        | LONGINT
        | VAR
        | AUTOMATIC
        | STATIC
        | VOID
        | GENVAR
        | TYPENAME"""
        p[0] = (p[1], p.slice[1].type == "TYPENAME")

    def p_type(self, p: Any) -> None:
        """type : sigtypes
        | sigtypes widths
        | widths"""
        words = p[1] if isinstance(p[1][0][0], str) else []
        named = [word for word, is_type in words if is_type]
        ranges = p[len(p) - 1] if not words or len(p) == 3 else []
        keywords = [word for word, is_type in words if not is_type]
        p[0] = tree.Type(keywords, ranges, None, named[0] if named else None, p.lineno(1))

    def p_width(self, p: Any) -> None:
        """width : LBRACKET expression COLON expression RBRACKET
        dimension : LBRACKET expression COLON expression RBRACKET
        | LBRACKET expression RBRACKET"""
        p[0] = (p[2], p[4] if len(p) == 6 else None)

    def p_name(self, p: Any) -> None:
        """name : ID optional_dimensions
        | ID optional_dimensions EQUALS expression"""
        p[0] = tree.Named(p[1], p[2], p[4] if len(p) == 5 else None, p.lineno(1))

    def p_declaration(self, p: Any) -> None:
        """declaration : type names SEMICOLON
        | type delay names SEMICOLON"""
        p[0] = tree.Declaration(p[1], p[len(p) - 2], p[2] if len(p) == 5 else None, p.lineno(1))

    def p_declaration_enum(self, p: Any) -> None:
        "declaration : enum names SEMICOLON"
        kind = tree.Type(["logic"], [], p[1], None, p.lineno(1))
        p[0] = tree.Declaration(kind, p[2], None, p.lineno(1))

    def p_enum(self, p: Any) -> None:
        "enum : ENUM optional_type LBRACE enum_members RBRACE"
        p[0] = tree.EnumType(p[2], p[4], p.lineno(1))

    def p_enum_member(self, p: Any) -> None:
        """enum_member : ID
        | ID EQUALS expression"""
        p[0] = (p[1], p[3] if len(p) == 4 else None, p.lineno(1))

    def p_typedef(self, p: Any) -> None:
        """typedef : TYPEDEF enum ID SEMICOLON
        | TYPEDEF type ID SEMICOLON"""
        kind = p[2] if isinstance(p[2], tree.Type) else tree.Type(["logic"], [], p[2], None, p.lineno(1))
        p[0] = tree.Typedef(p[3], kind, p.lineno(3))

    # -- module items --------------------------------------------------------------------------------------

    def p_item_null(self, p: Any) -> None:
        "item : SEMICOLON"
        p[0] = tree.Null(p.lineno(1))

    def p_item_assign(self, p: Any) -> None:
        "item : ASSIGN optional_delay assigns SEMICOLON"
        p[0] = [vast.Assign(left, right, p[2], lineno=at) for left, right, at in p[3]]

    def p_assign_pair(self, p: Any) -> None:
        "assign_pair : lvalue EQUALS expression"
        p[0] = (p[1], p[3], p.lineno(1))

    def p_item_always(self, p: Any) -> None:
        """item : ALWAYS basic_statement
        | ALWAYS_FF basic_statement
        | ALWAYS_COMB basic_statement
        | ALWAYS_LATCH basic_statement"""
        p[0] = tree.Always(p[1], p[2], p.lineno(1))

    def p_item_defparam(self, p: Any) -> None:
        "item : DEFPARAM defparams SEMICOLON"
        p[0] = p[2]

    def p_defparam(self, p: Any) -> None:
        "defparam : identifier EQUALS expression"
        p[0] = tree.Defparam(p[1], p[3], p.lineno(1))

    def p_item_generate(self, p: Any) -> None:
        "item : GENERATE items ENDGENERATE"
        p[0] = p[2]

    def p_gates(self, p: Any) -> None:
        """gates : GATE optional_delay instances SEMICOLON
        | SENS_OR optional_delay instances SEMICOLON"""
        p[0] = tree.Gates(p[1], p[3], p[2], p.lineno(1))

    def p_instance(self, p: Any) -> None:
        """instance : ID instances SEMICOLON
        | ID DELAY LPAREN port_args RPAREN instances SEMICOLON
        | ID DELAY plain_number instances SEMICOLON"""
        parameters, delay = [], None
        if len(p) == 8:
            parameters = p[4]
        elif len(p) == 6:
            delay = p[3]
        p[0] = tree.Instances(p[1], parameters, p[len(p) - 2], delay, p.lineno(1))

    def p_instance_body(self, p: Any) -> None:
        """instance_body : ID LPAREN port_args RPAREN
        | ID width LPAREN port_args RPAREN
        | LPAREN port_args RPAREN"""
        name = p[1] if len(p) > 4 else ""
        ports = p[len(p) - 2]
        if len(ports) == 1 and ports[0].name is None and ports[0].value is None:
            ports = []
        p[0] = tree.Instance(name, p[2] if len(p) == 6 else None, ports, p.lineno(1))

    def p_port_arg(self, p: Any) -> None:
        """port_arg : expression
        | empty"""
        p[0] = tree.PortArgument(None, p[1], False, p.lineno(1))

    def p_port_arg_named(self, p: Any) -> None:
        """port_arg : DOT ID LPAREN expression RPAREN
        | DOT ID LPAREN RPAREN
        | DOT ID
        | DOT TIMES"""
        p[0] = tree.PortArgument(p[2], p[4] if len(p) == 6 else None, len(p) == 3, p.lineno(2))

    # -- generate ------------------------------------------------------------------------------------------

    def p_generate_block(self, p: Any) -> None:
        """generate_block : BEGIN items END
        | BEGIN COLON ID items END"""
        p[0] = tree.GenerateBlock(p[3] if len(p) == 6 else None, p[len(p) - 2], p.lineno(1))

    def p_generate_if(self, p: Any) -> None:
        """generate_if : IF LPAREN expression RPAREN item
        | IF LPAREN expression RPAREN item ELSE item"""
        p[0] = tree.GenerateIf(p[3], p[5], p[7] if len(p) == 8 else None, p.lineno(1))

    def p_generate_for(self, p: Any) -> None:
        """generate_for : FOR LPAREN ID EQUALS expression SEMICOLON expression SEMICOLON step RPAREN item
        | FOR LPAREN GENVAR ID EQUALS expression SEMICOLON expression SEMICOLON step RPAREN item"""
        more = len(p) - 12
        p[0] = tree.GenerateFor(
            p[3 + more], p[5 + more], p[7 + more], p[9 + more], p[11 + more], bool(more), p.lineno(1)
        )

    def p_generate_case(self, p: Any) -> None:
        "generate_case : CASE LPAREN expression RPAREN generate_arms ENDCASE"
        p[0] = tree.GenerateCase(p[3], p[5], p.lineno(1))

    def p_generate_arm(self, p: Any) -> None:
        """generate_arm : expressions COLON item
        | DEFAULT COLON item
        | DEFAULT item"""
        p[0] = ([] if p[1] == "default" else p[1], p[len(p) - 1])

    # -- functions and tasks -------------------------------------------------------------------------------

    def p_subroutine(self, p: Any) -> None:
        """subroutine : FUNCTION optional_type ID portlist block_items ENDFUNCTION
        | TASK optional_type ID portlist block_items ENDTASK"""
        p[0] = tree.Subroutine(p[3], p[2], p[1] == "task", p[4], p[5], p.lineno(3))

    # -- statements ----------------------------------------------------------------------------------------

    def p_statement_null(self, p: Any) -> None:
        "basic_statement : SEMICOLON"
        p[0] = tree.Null(p.lineno(1))

    def p_block(self, p: Any) -> None:
        """block : BEGIN block_items END
        | BEGIN COLON ID block_items END"""
        p[0] = vast.Block(p[len(p) - 2], p[3] if len(p) == 6 else None, lineno=p.lineno(1))

    def p_statement_assignment(self, p: Any) -> None:
        """basic_statement : lvalue EQUALS expression SEMICOLON
        | lvalue LE expression SEMICOLON"""
        p[0] = tree.Assignment(p[1], p[3], p[2] == "=", None, p.lineno(1))

    def p_statement_assignment_delayed(self, p: Any) -> None:
        """basic_statement : lvalue EQUALS delay expression SEMICOLON
        | lvalue EQUALS event_control expression SEMICOLON
        | lvalue LE delay expression SEMICOLON
        | lvalue LE event_control expression SEMICOLON"""
        p[0] = tree.Assignment(p[1], p[4], p[2] == "=", p[3], p.lineno(1))

    def p_statement_step(self, p: Any) -> None:
        "basic_statement : short_step SEMICOLON"
        p[0] = p[1]

    def p_step(self, p: Any) -> None:
        """step : lvalue EQUALS expression
        | short_step"""
        p[0] = p[1] if len(p) == 2 else tree.Assignment(p[1], p[3], True, None, p.lineno(1))

    def p_short_step(self, p: Any) -> None:
        """short_step : lvalue ASSIGNOP expression
        | lvalue INCREMENT
        | INCREMENT lvalue"""
        operators = {
            "+": vast.Plus, "-": vast.Minus, "*": vast.Times, "/": vast.Divide, "%": vast.Mod, "&": vast.And,
            "|": vast.Or, "^": vast.Xor, "<<": vast.Sll, ">>": vast.Srl, "<<<": vast.Sla, ">>>": vast.Sra,
        }  # fmt: skip
        at = p.lineno(1)
        target, sign = (p[2], p[1]) if isinstance(p[1], str) else (p[1], p[2])
        amount = p[3] if len(p) == 4 else vast.IntConst("1", lineno=at)
        value = operators[sign[:-1]](target, amount, lineno=at)
        p[0] = tree.Assignment(target, value, True, None, at)

    def p_for(self, p: Any) -> None:
        """basic_statement : FOR LPAREN lvalue EQUALS expression SEMICOLON for_rest
        | FOR LPAREN type ID EQUALS expression SEMICOLON for_rest
        | FOR LPAREN SEMICOLON for_rest"""
        condition, step, body = p[len(p) - 1]
        start, kind = None, None
        if len(p) == 8:
            start = tree.Assignment(p[3], p[5], True, None, p.lineno(3))
        elif len(p) == 9:
            kind, variable = p[3], vast.Identifier(p[4], lineno=p.lineno(4))
            start = tree.Assignment(variable, p[6], True, None, p.lineno(4))
        p[0] = tree.For(start, condition, step, body, kind, p.lineno(1))

    def p_for_rest(self, p: Any) -> None:
        "for_rest : for_condition SEMICOLON for_step RPAREN basic_statement"
        p[0] = (p[1], p[3], p[5])

    def p_for_parts(self, p: Any) -> None:
        """for_condition : expression
        for_step : step"""
        p[0] = p[1]

    def p_repeat_statement(self, p: Any) -> None:
        "basic_statement : REPEAT LPAREN expression RPAREN basic_statement"
        p[0] = tree.Repeat(p[3], p[5], p.lineno(1))

    def p_priority_case(self, p: Any) -> None:
        """basic_statement : UNIQUE case_statement
        | UNIQUE casez_statement
        | UNIQUE if_statement
        | PRIORITY case_statement
        | PRIORITY casez_statement
        | PRIORITY if_statement"""
        p[0] = p[2]

    def p_casecontent_default_plain(self, p: Any) -> None:
        "casecontent_statement : DEFAULT basic_statement"
        p[0] = vast.Case(None, p[2], lineno=p.lineno(1))

    def p_statement_controlled(self, p: Any) -> None:
        "basic_statement : event_control basic_statement"
        p[0] = tree.EventControl(p[1], p[2], p.lineno(1))

    def p_statement_delayed(self, p: Any) -> None:
        "basic_statement : delay basic_statement"
        p[0] = tree.DelayControl(p[1], p[2], p.lineno(1))

    def p_statement_call(self, p: Any) -> None:
        """basic_statement : identifier SEMICOLON
        | functioncall SEMICOLON
        | systemcall SEMICOLON"""
        call = p[1]
        p[0] = vast.TaskCall(call, (), lineno=p.lineno(1)) if isinstance(call, vast.Identifier) else call

    def p_statement_return(self, p: Any) -> None:
        """basic_statement : RETURN expression SEMICOLON
        | RETURN SEMICOLON"""
        p[0] = tree.Return(p[2] if len(p) == 4 else None, p.lineno(1))

    def p_statement_refused(self, p: Any) -> None:
        """basic_statement : FOREVER basic_statement
        | WAIT LPAREN expression RPAREN basic_statement
        | FORK block_items JOIN
        | FORK COLON ID block_items JOIN
        | DISABLE identifier SEMICOLON
        | TRIGGER identifier SEMICOLON
        | ASSIGN lvalue EQUALS expression SEMICOLON
        | DEASSIGN lvalue SEMICOLON
        | FORCE lvalue EQUALS expression SEMICOLON
        | RELEASE lvalue SEMICOLON"""
        p[0] = tree.Refused("assign inside a process" if p[1] == "assign" else p[1], p.lineno(1))

    # -- events and delays ---------------------------------------------------------------------------------

    def p_event_control(self, p: Any) -> None:
        """event_control : AT TIMES
        | AT LPAREN TIMES RPAREN
        | AT identifier
        | AT LPAREN events RPAREN"""
        if "*" in (p[2], p[len(p) - 2]):
            p[0] = None
        else:
            p[0] = p[3] if len(p) == 5 else [("level", p[2], p.lineno(2))]

    def p_event_separator(self, p: Any) -> None:
        """event_separator : SENS_OR
        | COMMA"""

    def p_event(self, p: Any) -> None:
        """event : POSEDGE expression
        | NEGEDGE expression
        | expression"""
        p[0] = (p[1] if len(p) == 3 else "level", p[len(p) - 1], p.lineno(1))

    def p_delay(self, p: Any) -> None:
        """delay : DELAY plain_number
        | DELAY identifier
        | DELAY LPAREN delay_values RPAREN"""
        p[0] = vast.DelayStatement(p[2], lineno=p.lineno(1))

    def p_delay_values(self, p: Any) -> None:
        """delay_values : expression
        | expression COLON expression COLON expression
        | delay_values COMMA expression
        | delay_values COMMA expression COLON expression COLON expression"""

    def p_plain_number(self, p: Any) -> None:
        """plain_number : NUMBER
        | FLOATNUMBER"""
        p[0] = p[1]

    # -- expressions that pyverilog lacks or misreads ------------------------------------------------------

    def p_lvalue_concat(self, p: Any) -> None:
        "lvalue : LBRACE lvalues RBRACE"
        p[0] = vast.Concat(p[2], lineno=p.lineno(1))

    def p_indexed(self, p: Any) -> None:
        """indexed : identifier LBRACKET expression PLUSCOLON expression RBRACKET
        | identifier LBRACKET expression MINUSCOLON expression RBRACKET
        | pointer LBRACKET expression PLUSCOLON expression RBRACKET
        | pointer LBRACKET expression MINUSCOLON expression RBRACKET"""
        p[0] = tree.IndexedSelect(p[1], p[3], p[5], p[4] == "+:", p.lineno(1))

    def p_fill(self, p: Any) -> None:
        "fill : FILL"
        p[0] = tree.Fill(p[1][1], p.lineno(1))

    def p_cast(self, p: Any) -> None:
        """cast : plain_number TICK LPAREN expression RPAREN
        | identifier TICK LPAREN expression RPAREN
        | LPAREN expression RPAREN TICK LPAREN expression RPAREN
        | cast_word TICK LPAREN expression RPAREN"""
        kind = p[2] if len(p) == 8 else p[1]
        if len(p) == 6 and p.slice[1].type == "plain_number":
            kind = vast.IntConst(kind, lineno=p.lineno(1))
        p[0] = tree.Cast(kind, p[len(p) - 2], p.lineno(1))

    def p_cast_word(self, p: Any) -> None:
        """cast_word : SIGNED
        | UNSIGNED
        | INT
        | INTEGER
        | BYTE
        | SHORTINT
        | LONGINT
        | BIT
        | LOGIC
        | TYPENAME"""
        p[0] = p[1]

    def p_intnumber(self, p: Any) -> None:
        """intnumber : NUMBER
        | BASED"""
        p[0] = p[1]

    def p_systemcall(self, p: Any) -> None:
        """systemcall : SYSTEM
        | SYSTEM LPAREN sysargs RPAREN"""
        p[0] = vast.SystemCall(p[1][1:], tuple(p[3]) if len(p) == 5 else (), lineno=p.lineno(1))
