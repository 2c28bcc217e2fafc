package syntax

import (
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
)

// A File is a parsed text. Statements are in file order. The tree is complete
// only if the parse gave no errors.
type File struct {
	Name       string
	Source     []byte
	Statements []Statement
	// Tail are the comments behind the last statement.
	Tail []Comment
}

// A Statement is one of *Title, *Use, *Given, *Rail, *Ambient, *Part, *Path,
// *Place, *Load, *Hold, *Target, *Keep, *Batch, *Assume, *Hand, *Measured.
type Statement interface {
	Where() diag.Span
}

// Comments that belong to a statement travel with it; see Notes.
type stmt struct {
	Span  diag.Span
	Notes Notes
}

// Where returns the statement's place.
func (s *stmt) Where() diag.Span { return s.Span }

// Notes are the comments around a statement, texts as written without '#'.
type Notes struct {
	// Before are the comments on the lines before the statement. Blank tells
	// that a blank line stands right before it, behind those.
	Before []Comment
	Blank  bool
	// Within are those between the lines of a path, a part or an assume
	// statement. Within other statements they move to Before.
	Within []Inner
	// Behind is the comment on the statement's last line.
	Behind string
}

// A Comment is one line of comment. Blank tells that a blank line stands before.
type Comment struct {
	Text  string
	Blank bool
}

// An Inner is a comment within a statement: After so many segments or parameters,
// Own if it has a line of its own.
type Inner struct {
	After int
	Own   bool
	Text  string
}

// A Word is a name as written. A word that refers may be LAMP.1 (one of a row) or
// D1:D2 (a node that the language named). A word that stands as a node may be a
// number, which package netlist refuses.
type Word struct {
	Text string
	Span diag.Span
}

// A Literal is a quantity as written.
type Literal struct {
	quantity.Quantity
	Text string
	Span diag.Span
	// Bare tells that no unit was written; Infinite that the word was
	// "infinite" (Value is then +Inf).
	Bare, Infinite bool
}

// A Spread is how values lie between bounds.
type Spread int

// The spreads: uniform unless the text says otherwise.
const (
	Uniform Spread = iota
	Normal
	Pick
)

// Bounds are a tolerance (Relative, 0.05 for 5%) or stated ends (Low, High), or
// a list to pick from.
type Bounds struct {
	Relative  *Literal
	Low, High *Literal
	Spread    Spread
	Picks     []Literal
	Span      diag.Span
}

// A Value is a literal or a given name, with bounds, and for a stated point of a
// curve the second co-ordinate (drop = 0.62 V at 1 mA).
type Value struct {
	Literal *Literal // nil where Name is set
	Name    *Word
	Bounds  *Bounds
	At      *Value
	Span    diag.Span
}

// The statements.
type (
	Title struct {
		stmt
		Text string
	}
	Use struct {
		stmt
		Path    string // as written between quotes; empty for a shelf
		Shelf   *Word  // use generic
		PathPos diag.Span
	}
	Given struct {
		stmt
		Name   Word
		Value  Expr
		Bounds *Bounds
	}
	Rail struct {
		stmt
		Name  Word
		Value Value
	}
	Ambient struct {
		stmt
		Value Value
	}
	Part struct {
		stmt
		Name   Word
		Kind   Word
		Params []Param
	}
	Path struct {
		stmt
		Segments []Segment
	}
	Place struct {
		stmt
		Name      Word
		Part      Word
		Pins      []Pin
		Modifiers []Modifier
	}
	Load struct {
		stmt
		Names []Word
	}
	Hold struct {
		stmt
		Quantity Expr // a *QuantityExpr or an expression
		Within   Value
	}
	Target struct {
		stmt
		Quantity Expr
		Value    Value
		Within   *Value
	}
	Keep struct {
		stmt
		Left, Right Expr
		Greater     bool
	}
	Batch struct {
		stmt
		Names []Word
	}
	Assume struct {
		stmt
		Items []Param
	}
	Hand struct {
		stmt
		Quantity Expr
		Value    Expr
	}
	Measured struct {
		stmt
		Quantity Expr
		Value    Value
	}
)

// A Param is "key = value" of a part, or of assume, where Of is the bracketed
// name in drop(sig).
type Param struct {
	Key   Word
	Of    *Word
	Value Value
	Span  diag.Span
}

// A Segment of a path is a node (Element nil) or an element.
type Segment struct {
	Node    *Word
	Element *Element
}

// What is what an element's second word says it is.
type What int

// The kinds of second word.
const (
	WhatValue What = iota // a quantity: resistance or current
	WhatName              // a part or given value, bound by package netlist
	WhatDrop              // drop VALUE
	WhatCell              // cell VALUE
	WhatOpen              // ? E24
)

// An Element is a segment of two words or more.
type Element struct {
	Name      Word
	What      What
	Value     *Value // WhatValue, WhatDrop, WhatCell
	Ref       Word   // WhatName; a code such as R22 has Value as well
	Series    Word   // WhatOpen
	Modifiers []Modifier
	Span      diag.Span
}

// A Modifier follows an element: a tolerance that does not stand right behind a
// number (Key "", Bounds set), a rating or
// temperature coefficient (Key "", Value set), or key=value / a lone word:
// base, reversed, row, size, beside.
type Modifier struct {
	Key    Word
	Value  *Value
	Name   *Word
	Bounds *Bounds
	Span   diag.Span
}

// A Pin is base=NODE of a place statement.
type Pin struct {
	Key  Word
	Node Word
}

// An Expr is one of *Number, *NameExpr, *QuantityExpr, *Unary, *Binary, *Call.
type Expr interface {
	Where() diag.Span
}

// The expressions.
type (
	Number struct{ Literal }
	// NameExpr is a name: a given value, an element, a rail, ambient.
	NameExpr struct{ Word }
	// QuantityExpr is SUBJECT.SYMBOL, or SUBJECT.INDEX.SYMBOL for one of a row.
	QuantityExpr struct {
		Subject Word
		Index   int // 0 when none is written
		Symbol  Word
		Span    diag.Span
	}
	Unary struct {
		Minus bool
		X     Expr
		Span  diag.Span
	}
	Binary struct {
		Op   byte // + - * / ^
		X, Y Expr
		Span diag.Span
	}
	Call struct {
		Func Word // parallel sqrt ln exp
		Args []Expr
		Span diag.Span
	}
)

// Where returns the place of each expression.
func (e *Number) Where() diag.Span       { return e.Literal.Span }
func (e *NameExpr) Where() diag.Span     { return e.Word.Span }
func (e *QuantityExpr) Where() diag.Span { return e.Span }
func (e *Unary) Where() diag.Span        { return e.Span }
func (e *Binary) Where() diag.Span       { return e.Span }
func (e *Call) Where() diag.Span         { return e.Span }
