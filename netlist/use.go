package netlist

import (
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync"

	"biaswright/netlist/diag"
	"biaswright/netlist/syntax"
)

// A Source gives the texts that `use` names.
type Source interface {
	// Open returns the text of the file that `use "path"` names in the file
	// from, and the name it is known by from then on (circles are found by it).
	Open(from, path string) (name string, text []byte, err error)
	// Shelf returns the text of the shelf of that name (use generic).
	Shelf(name string) (text []byte, ok bool)
}

// Files is the Source of the file system: a path is relative to the file that
// names it. Shelves are the texts that ship, by name; they are only read. The
// zero value has no shelf.
type Files struct {
	Shelves map[string][]byte
}

// Open reads the file. A text longer than the language takes is refused before it
// is read to its end.
func (f Files) Open(from, path string) (name string, text []byte, err error) {
	name = filepath.FromSlash(path)
	if !filepath.IsAbs(name) {
		name = filepath.Join(filepath.Dir(from), name)
	}
	file, err := os.Open(name)
	if err != nil {
		return name, nil, err
	}
	defer file.Close() // only read: nothing is lost if closing fails
	text, err = io.ReadAll(io.LimitReader(file, syntax.MaxSize+1))
	if err == nil && len(text) > syntax.MaxSize {
		err = fmt.Errorf("%s is longer than the %d MB that a text may have", name, syntax.MaxSize>>20)
	}
	return name, text, err
}

// Shelf returns the text of a shelf.
func (f Files) Shelf(name string) (text []byte, ok bool) {
	text, ok = f.Shelves[name]
	return text, ok
}

// A library holds the texts that were taken in, so that each is read once. Circuits
// that were made of each other share it, perhaps between goroutines.
type library struct {
	src Source

	mu    sync.Mutex
	texts map[string]*syntax.File // by name; nil for one with errors
	names map[[2]string]string    // by the text that uses it and the path written there
}

func newLibrary(src Source) *library {
	return &library{src: src, texts: map[string]*syntax.File{}, names: map[[2]string]string{}}
}

// cleanName is a file's name in the form in which circles are found.
func cleanName(name string) string { return filepath.Clean(name) }

// shelfName is what messages call a shelf's text.
func shelfName(name string) string { return "shelf " + name }

// takeIn brings the parts and given values of the texts that f uses into s. chain
// are the names of the texts that led here, f's own last.
func (r *resolver) takeIn(s *scope, f *syntax.File, chain []string) {
	for _, u := range statements[*syntax.Use](f) {
		name, tree, ok := r.used(u, f.Name, chain)
		if !ok {
			r.partial = true // the names that it would have brought in are not unknown
			continue
		}
		from, known := r.scopes[name]
		if !known {
			from = newScope(name, false)
			r.scopes[name] = from
			r.takeIn(from, tree, append(slices.Clone(chain), name))
			r.declareTaken(from, tree)
		}
		for _, t := range from.exports() {
			s.take(t)
		}
	}
}

// declareTaken enters the parts and given values of a text that is taken in. Its
// other statements are its own business.
func (r *resolver) declareTaken(s *scope, f *syntax.File) {
	for _, st := range f.Statements {
		switch st := st.(type) {
		case *syntax.Given:
			r.declare(s, st.Name, aGiven).given = st
		case *syntax.Part:
			r.declare(s, st.Name, aPart).part = st
		}
	}
}

// used reads the text that a use statement names, and refuses circles.
func (r *resolver) used(u *syntax.Use, from string, chain []string) (string, *syntax.File, bool) {
	r.library.mu.Lock()
	defer r.library.mu.Unlock()
	name, seen := r.library.names[[2]string{from, u.Path}]
	var text []byte
	if !seen || u.Shelf != nil {
		var ok bool
		if name, text, ok = r.fetch(u, from); !ok {
			return "", nil, false
		}
		r.library.names[[2]string{from, u.Path}] = name
	}
	if at := slices.Index(chain, cleanName(name)); at >= 0 {
		r.errorf("circle", usePlace(u), "", "the files use each other in a circle: %s", strings.Join(append(slices.Clone(chain[at:]), cleanName(name)), " -> "))
		return "", nil, false
	}
	const deepestUse = 50 // files that use each other in a row; a guard against links that never end
	if len(chain) > deepestUse {
		r.errorf("circle", usePlace(u), "", "more than %d files use each other in a row", deepestUse)
		return "", nil, false
	}
	if tree, known := r.library.texts[name]; known {
		return name, tree, tree != nil
	}
	tree, diags := syntax.Parse(name, text)
	r.diags = append(r.diags, diags...)
	if diags.HasErrors() {
		tree = nil
	}
	r.library.texts[name] = tree
	return name, tree, tree != nil
}

func usePlace(u *syntax.Use) diag.Span {
	if u.Shelf != nil {
		return u.Shelf.Span
	}
	return u.PathPos
}

// fetch gets the text of a use statement.
func (r *resolver) fetch(u *syntax.Use, from string) (name string, text []byte, ok bool) {
	src := r.library.src
	if src == nil {
		r.errorf("use", usePlace(u), "", "other texts cannot be read here")
		return "", nil, false
	}
	if u.Shelf != nil {
		text, ok = src.Shelf(u.Shelf.Text)
		if !ok {
			r.errorf("use", u.Shelf.Span, `a file is named in quotes: use "`+u.Shelf.Text+`.bias"`, "there is no shelf called %s", u.Shelf.Text)
		}
		return shelfName(u.Shelf.Text), text, ok
	}
	name, text, err := src.Open(from, u.Path)
	if err != nil {
		var path *os.PathError
		if errors.As(err, &path) {
			err = path.Err // the message names the path already
		}
		r.errorf("use", u.PathPos, "", "%s cannot be read: %v", u.Path, err)
		return "", nil, false
	}
	return name, text, true
}
