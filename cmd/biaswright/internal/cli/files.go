package cli

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"sync"

	"biaswright/devices/shelf"
	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/netlist/syntax"
)

// standardInput is the name that means the standard input.
const standardInput = "-"

// shownName is what answers and messages call a file.
func shownName(name string) string {
	if name == standardInput {
		return "standard input"
	}
	return name
}

// read returns a file's text, or what standard input holds. It stops reading
// where a text is longer than the language admits.
func (r *runner) read(name string) ([]byte, error) {
	if name == standardInput {
		return bounded(r.in)
	}
	f, err := os.Open(name)
	if err != nil {
		return nil, plainError(err)
	}
	defer f.Close()
	if info, err := f.Stat(); err == nil && info.IsDir() {
		return nil, errors.New("it is a directory")
	}
	return bounded(f)
}

func bounded(in io.Reader) ([]byte, error) {
	var b bytes.Buffer
	n, err := b.ReadFrom(io.LimitReader(in, syntax.MaxSize+1))
	if err != nil {
		return nil, plainError(err)
	}
	if n > syntax.MaxSize {
		return nil, fmt.Errorf("it is longer than %d MiB", syntax.MaxSize>>20)
	}
	return b.Bytes(), nil
}

// plainError drops the operation and path of a file error, which the message
// around it tells already.
func plainError(err error) error {
	var p *fs.PathError
	if errors.As(err, &p) {
		return p.Err
	}
	var l *os.LinkError
	if errors.As(err, &l) {
		return l.Err
	}
	return err
}

// A library gives the texts that `use` names, and keeps them for messages.
type library struct {
	netlist.Files
	r *runner
}

func (r *runner) library() netlist.Source {
	return library{netlist.Files{Shelves: shelf.All()}, r}
}

func (l library) Open(from, path string) (string, []byte, error) {
	name, text, err := l.Files.Open(from, path)
	l.r.texts[name] = text
	return name, text, err
}

// diagnose prints diagnostics on standard error, with the lines they are about.
func (r *runner) diagnose(list diag.List) {
	const most = 100 // a file that is none of ours needs no more to say so
	p := diag.Printer{
		Source: func(file string) []byte { return r.texts[file] },
		Colour: coloured(r.err),
		Plain:  r.plain,
		Limit:  most,
	}
	_ = p.Write(r.err, list) // nobody is left to tell
}

// A partialFile is the file being written, for an interrupt to remove.
type partialFile struct {
	mu   sync.Mutex
	name string
}

func (p *partialFile) set(name string) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.name = name
}

func (p *partialFile) remove() {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.name != "" {
		os.Remove(p.name)
	}
}

// replace writes a file so that it holds either its old or its new text, never a
// part: the text goes to a file beside it, which then takes its name. What cannot be made
// again must be safe on the disk before that.
func (r *runner) replace(name string, text []byte, safely bool) (err error) {
	target, err := filepath.EvalSymlinks(name) // a link stays a link
	if err != nil {
		return plainError(err)
	}
	info, err := os.Stat(target)
	if err != nil {
		return plainError(err)
	}
	f, err := os.CreateTemp(filepath.Dir(target), ".biaswright-*")
	if err != nil {
		return plainError(err)
	}
	r.partial.set(f.Name())
	defer func() {
		if err != nil {
			f.Close()
			os.Remove(f.Name())
		}
		r.partial.set("")
	}()
	if _, err = f.Write(text); err != nil {
		return plainError(err)
	}
	if err = f.Chmod(info.Mode().Perm()); err != nil {
		return plainError(err)
	}
	if safely {
		if err = f.Sync(); err != nil {
			return plainError(err)
		}
	}
	if err = f.Close(); err != nil {
		return plainError(err)
	}
	return plainError(os.Rename(f.Name(), target))
}

// create writes a file, new or in the place of an old one; no part of it is left where
// that fails. What is no ordinary file, such as a pipe, is written to as it is. An old one is
// replaced safely, or not, as replace has it.
func (r *runner) create(name string, text []byte, safely bool) error {
	info, err := os.Stat(name)
	switch {
	case err == nil && info.Mode().IsRegular():
		return r.replace(name, text, safely)
	case err == nil && info.IsDir():
		return errors.New("it is a directory")
	case err == nil:
		return plainError(os.WriteFile(name, text, 0))
	}
	f, err := os.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	if err != nil {
		return plainError(err)
	}
	r.partial.set(name)
	defer r.partial.set("")
	_, err = f.Write(text)
	if closing := f.Close(); err == nil {
		err = closing
	}
	if err != nil {
		os.Remove(name)
	}
	return plainError(err)
}
