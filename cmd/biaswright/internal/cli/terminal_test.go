package cli

import (
	"strings"
	"testing"
	"time"
)

// A long run tells where it is, on one line that it leaves empty behind it; not before
// some time has passed, and only now and then.
func TestProgress(t *testing.T) {
	long := func(p *progress) { p.last = time.Now().Add(-time.Hour) }
	var out strings.Builder
	p := &progress{w: &out, rows: 1000, what: "points", last: time.Now().Add(time.Hour)}
	for range 500 { // hardly begun
		p.step()
	}
	p.erase()
	if out.Len() != 0 {
		t.Fatalf("told too soon: %q", out.String())
	}
	long(p)
	for range 140 { // by now some time has passed: the next look at the clock tells, once
		p.step()
	}
	if got, want := out.String(), "\r512 of 1000 points"; got != want {
		t.Fatalf("told %q, want %q", got, want)
	}
	out.Reset()
	long(p)
	p.to(900)
	p.erase()
	if got, want := out.String(), "\r900 of 1000 points\r\x1b[K"; got != want {
		t.Fatalf("told %q, want %q", got, want)
	}
}

// What is no terminal is told nothing.
func TestProgressIsForTerminals(t *testing.T) {
	var errs strings.Builder
	r := &runner{err: &errs}
	p := r.progress(10, "points")
	p.last = time.Time{}
	p.to(5)
	p.erase()
	if errs.Len() != 0 {
		t.Errorf("told %q", errs.String())
	}
}
