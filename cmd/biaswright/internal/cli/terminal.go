package cli

import (
	"io"
	"os"

	"golang.org/x/term"

	"biaswright/cmd/biaswright/internal/render"
)

// look decides how screens are drawn.
func (r *runner) look() render.Look {
	return render.Look{Plain: r.plain, Colour: coloured(r.out)}
}

// coloured tells whether a stream takes colour: only a terminal does, and not
// where NO_COLOR is set to anything (the convention of that name) or the terminal
// says it is a dumb one.
func coloured(w io.Writer) bool {
	f, ok := w.(*os.File)
	return ok && os.Getenv("NO_COLOR") == "" && os.Getenv("TERM") != "dumb" && term.IsTerminal(int(f.Fd()))
}
