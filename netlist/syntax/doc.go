// Package syntax turns a .bias text into a tree and a tree into its canonical
// text. It knows words, not circuits: names are bound by package netlist.
//
// # Grammar
//
// In extended Backus-Naur form: [ ] is optional, { } repeats, | chooses. Behind a
// production, "e.g." is an example of it and "not" what it refuses. A statement
// ends with its line, unless the line ends in an arrow or a comma or the next one
// begins with an arrow. Comments run from # to the end of the line, and with blank
// lines may stand anywhere between lines.
//
//	File      = { Statement } .
//	  e.g.      ambient = 25 degC
//	Statement = Title | Use | Given | Rail | Ambient | Part | Path | Place | Load |
//	            Hold | Target | Keep | Batch | Assume | Hand | Measured .
//	  e.g.      load LAMP # the lamp string
//	  not       circuit = 5
//
//	Title     = "title" Text .
//	  e.g.      title "Two-diode \"reference\""
//	  not       title Reference
//	Use       = "use" ( Text | Name ) .
//	  e.g.      use "parts.bias"
//	  e.g.      use generic
//	  not       use parts.bias
//	Given     = "given" Name "=" Expr [ Bounds ] .
//	  e.g.      given RL = 2 * 47 ohm 1%
//	  not       given RL 47 ohm
//	Rail      = "rail" Name "=" Value .
//	  e.g.      rail VEE = -12 V (-13 V .. -11 V)
//	  not       rail VEE
//	Ambient   = "ambient" "=" Value .
//	  e.g.      ambient = 25 degC (-20 degC .. 60 degC)
//	  not       ambient 25 degC
//	Part      = "part" Name Name [ Params ] .
//	  e.g.      part sig diode drop = 0.62 V at 1 mA, n = 1.8
//	  e.g.      part plain npn
//	  not       part sig n = 1.8
//	Path      = "path" Segment { Arrow Segment } .
//	  e.g.      path VCC -> R1 1.8k -> bias → D1 sig -> gnd
//	  not       path VCC -> -> gnd
//	Place     = "place" Name Name { Pin "=" Node | Modifier } .
//	  e.g.      place Q1 gp collector=out base=bias emitter=tail size=8
//	  not       place Q1 collector=out
//	Load      = "load" Ref { Ref } .
//	  e.g.      load LAMP.1 LAMP.2
//	  not       load A, B
//	Batch     = "batch" Ref { Ref } .
//	  e.g.      batch Q1 Q2
//	  not       batch
//	Hold      = "hold" Expr "within" Value .
//	  e.g.      hold LAMP.I within 5%
//	  not       hold LAMP.I
//	Target    = "target" Expr "=" Value [ "within" Value ] .
//	  e.g.      target out.V = 5 V within 10 mV
//	  not       target out.V within 10 mV
//	Keep      = "keep" Expr ( "<" | ">" ) Expr .
//	  e.g.      keep Q1.P + Q2.P < 250 mW
//	  not       keep Q1.P = 250 mW
//	Assume    = "assume" Param { "," Param } .
//	  e.g.      assume Vbe = 0.7 V, drop(sig) = 0.7 V, betaF = infinite
//	  not       assume Vbe 0.7 V
//	Hand      = "hand" Expr "=" Expr .
//	  e.g.      hand RE.I = tail.V / RE
//	  not       hand RE.I
//	Measured  = "measured" Expr "=" Value .
//	  e.g.      measured RE.I = 9.8 mA
//	  not       measured RE.I = 9.8 mA / 2
//
//	Segment   = Node | Element .
//	  e.g.      D1:D2
//	  not       LAMP.1
//	Element   = Name ( Value | Name | "drop" Value | "cell" Value | "?" Name ) { Modifier } .
//	  e.g.      RE 47 1% 100 ppm/K 0.25 W
//	  e.g.      LAMP amber row=2
//	  e.g.      RX ? E24
//	  e.g.      B1 cell 1.5 V (1.1 V .. 1.6 V)
//	  not       47 1%
//	Modifier  = Bounds | Number | "reversed" | Name "=" ( Number | Ref ) .
//	  e.g.      base=bias
//	  e.g.      -200 ppm/K
//	  not       sideways
//	Params    = Param { "," Param } .
//	  e.g.      n = 2, Rbulk = 5 ohm
//	  not       n = 2 Rbulk = 5 ohm
//	Param     = Name [ "(" Name ")" ] "=" Value [ "at" Value ] .
//	  e.g.      Vz = 5.6 V 5% at 5 mA
//	  not       Vz = 5.6 V at 5 mA 5%
//
//	Value     = ( Number | Name | "infinite" ) [ Bounds ] .
//	  e.g.      180 (100 .. 300)
//	  not       180 ..
//	Bounds    = Ends [ "normal" | "pick" Number { Number } ] | "pick" Number { Number } .
//	  e.g.      5% normal
//	  e.g.      (100 .. 300) pick 100 150 250
//	  not       normal
//	Ends      = [ "±" ] Number | "(" Number ".." Number ")" .
//	  e.g.      ±5%
//	  not       ±5 V
//
//	Expr      = Product { ( "+" | "-" ) Product } .
//	  e.g.      VCC - tail.V + 5 mV
//	  not       VCC -
//	Product   = Signed { ( "*" | "/" ) Signed } .
//	  e.g.      0.7 V / RE * -2
//	  not       0.7 V // RE
//	Signed    = { "-" | "+" } Power .
//	  e.g.      -RE.V
//	  not       - * 2
//	Power     = Operand [ "^" Signed ] .
//	  e.g.      RE.I^2
//	  not       ^2
//	Operand   = Number | Name | Quantity | "(" Expr ")" | Name "(" Expr { "," Expr } ")" .
//	  e.g.      parallel(R1, 10 kohm)
//	  e.g.      (2 + 3)
//	  not       (2 + 3
//	Quantity  = Node "." Name | Name "." Index "." Name .
//	  e.g.      LAMP.1.I
//	  not       LAMP.1
//
//	Number    = [ "-" | "+" ] Digits [ "." Digits ] [ Exponent ] [ Prefix ] [ Unit ] | Code .
//	  e.g.      1.8 kohm
//	  e.g.      4k7
//	  e.g.      1e-15 A
//	  not       1.8 k
//	Node      = Ref [ ":" Ref ] .
//	  e.g.      LAMP.1:LAMP.2
//	Ref       = Name [ "." Index ] .
//	  e.g.      LAMP
//	Arrow     = "->" | "→" .
//	  e.g.      →
//	  not       - >
//
// A Name is made of ASCII letters, digits and _ and does not read as a Number. A
// Text stands between straight quotation marks, with \" and \\ for the mark and
// the backslash. Prefix, Unit and Code are those of package quantity; a space may
// stand before a unit. The pins of a place statement are collector, base, emitter,
// anode and cathode.
package syntax
