package cli

import (
	"fmt"
	"io"
	"os"
	"time"

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

// A progress tells a long run's state on a terminal, and erases itself.
type progress struct {
	w          io.Writer // nil where there is nobody to tell
	done, rows int
	what       string
	last       time.Time
	told       bool
}

func (r *runner) progress(rows int, what string) *progress {
	p := &progress{rows: rows, what: what, last: time.Now()}
	if f, ok := r.err.(*os.File); ok && term.IsTerminal(int(f.Fd())) {
		p.w = f
	}
	return p
}

func (p *progress) step() {
	p.done++
	const seldom = 64 // rows between looks at the clock
	if p.done%seldom == 0 {
		p.tell()
	}
}

// to notes that so many are done.
func (p *progress) to(done int) {
	p.done = done
	p.tell()
}

func (p *progress) tell() {
	const interval = 200 * time.Millisecond // quick enough to be read as movement
	if p.w == nil || time.Since(p.last) < interval {
		return
	}
	p.last, p.told = time.Now(), true
	fmt.Fprintf(p.w, "\r%d of %d %s", p.done, p.rows, p.what)
}

func (p *progress) erase() {
	if p.told {
		fmt.Fprint(p.w, "\r\x1b[K") // ECMA-48: erase to the end of the line
	}
}
