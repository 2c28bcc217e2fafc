package cli

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"biaswright/netlist/syntax"
)

// A file holds its old text or its new one, and nothing is left beside it.
func TestReplace(t *testing.T) {
	dir := t.TempDir()
	name, link := filepath.Join(dir, "a.bias"), filepath.Join(dir, "link.bias")
	if err := os.WriteFile(name, []byte("old"), 0o640); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink("a.bias", link); err != nil {
		t.Fatal(err)
	}
	r := &runner{}
	if err := r.replace(link, []byte("new"), true); err != nil {
		t.Fatal(err)
	}
	if got, err := os.ReadFile(name); err != nil || string(got) != "new" {
		t.Errorf("%q, %v", got, err)
	}
	if info, err := os.Lstat(link); err != nil || info.Mode()&os.ModeSymlink == 0 {
		t.Errorf("the link is gone: %v, %v", info.Mode(), err)
	}
	if info, err := os.Stat(name); err != nil || info.Mode().Perm() != 0o640 {
		t.Errorf("permissions are %v, %v", info.Mode(), err)
	}
	left(t, dir, 2)
}

func TestReplaceThatFailsLeavesNothing(t *testing.T) {
	dir := t.TempDir()
	folder := filepath.Join(dir, "folder")
	if err := os.MkdirAll(filepath.Join(folder, "inner"), 0o755); err != nil {
		t.Fatal(err)
	}
	r := &runner{}
	if err := r.replace(folder, []byte("new"), true); err == nil {
		t.Error("a folder is replaced by a file")
	}
	if err := r.replace(filepath.Join(dir, "gone", "a.bias"), nil, true); err == nil {
		t.Error("a file is written where no folder is")
	}
	left(t, dir, 1)
}

func left(t *testing.T, dir string, want int) {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	if len(entries) != want {
		t.Errorf("%d entries, want %d: %v", len(entries), want, entries)
	}
}

// An endless input is refused at the limit.
func TestReadingIsBounded(t *testing.T) {
	endless := &endlessInput{}
	if _, err := bounded(endless); err == nil {
		t.Fatal("an endless text is read")
	}
	const buffer = 2 // the reader may ask for more than it keeps
	if endless.given > buffer*syntax.MaxSize {
		t.Errorf("%d bytes read", endless.given)
	}
	if _, err := bounded(strings.NewReader("rail V = 1 V\n")); err != nil {
		t.Error(err)
	}
}

type endlessInput struct{ given int }

func (e *endlessInput) Read(b []byte) (int, error) {
	e.given += len(b)
	return len(b), nil
}
