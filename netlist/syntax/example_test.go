package syntax_test

import (
	"fmt"
	"os"

	"biaswright/netlist/diag"
	"biaswright/netlist/syntax"
)

func ExamplePrint() {
	text := `rail VCC=12V(10.8V..13.2V)   # the battery
path VCC→R1 1.8k±5%→bias→D1 sig→gnd`
	tree, _ := syntax.Parse("mast.bias", []byte(text))
	os.Stdout.Write(syntax.Print(tree))
	// Output:
	// rail    VCC = 12 V (10.8 V .. 13.2 V)  # the battery
	// path VCC -> R1 1.8k 5% -> bias -> D1 sig -> gnd
}

func ExampleParse() {
	text := []byte("rail VCC = 12,5 V\npath VCC -> R1 1 meg -> gnd\n")
	_, list := syntax.Parse("mast.bias", text)
	p := diag.Printer{Source: func(string) []byte { return text }}
	if err := p.Write(os.Stdout, list); err != nil {
		fmt.Println(err)
	}
	// Output:
	// mast.bias:1:12: error: 12,5 V has a decimal comma
	//   rail VCC = 12,5 V
	//              ^~~~~~
	//   hint: the decimal point is a point: 12.5 V
	// mast.bias:2:16: error: meg is no SI prefix
	//   path VCC -> R1 1 meg -> gnd
	//                  ^~~~~
	//   hint: mega is written M: 1M
}

func ExampleExprText() {
	x, _ := syntax.ParseExpr("expression", "(VCC-0.7V)/parallel(R1,R2)")
	fmt.Println(syntax.ExprText(x))
	// Output: (VCC - 0.7 V) / parallel(R1, R2)
}
