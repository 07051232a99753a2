package userfile

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"unicode/utf8"
)

// MaxSize is the largest file read, bytes. Files written by hand are far smaller.
const MaxSize = 1 << 20

// File is a file whose form is right. Ask it for its tables and keys; Err then
// tells what was wrong with them and which keys nobody asked for.
type File struct {
	*root         // the keys outside of any table, and the tables themselves
	Name   string // as given
	Source string // verbatim

	errs []*failure
}

// root is embedded, so that a file has the getters of its outermost table.
type root = Table

// Root is the outermost table.
func (f *File) Root() *Table { return f.root }

// failure is a mistake; missing is the key that was not there.
type failure struct {
	Error
	table   *node
	missing string
}

// Read reads a file up to MaxSize. A mistake of form (syntax, a key twice,
// encoding) is returned here, alone.
func Read(path string) (*File, error) {
	data, err := load(path)
	if err != nil {
		return nil, err
	}
	return Parse(path, data)
}

func load(path string) ([]byte, error) {
	fail := func(err error, want string) error { return &Error{File: path, Want: want, Err: err} }
	fi, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil, fail(err, "no such file; give the path of one, or write a first one with: nightbench new DIR --example")
	case err != nil:
		return nil, fail(err, "can't be read: "+err.Error())
	case fi.IsDir():
		return nil, fail(nil, "is a folder; give the path of a file in it")
	case !fi.Mode().IsRegular():
		return nil, fail(nil, "is no ordinary file; give the path of one")
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, fail(err, "can't be read: "+err.Error()+"; check who may read it")
	}
	defer f.Close()
	data, err := io.ReadAll(io.LimitReader(f, MaxSize+1))
	if err != nil {
		return nil, fail(err, "can't be read: "+err.Error())
	}
	return data, nil
}

// Parse reads data as the file called name.
func Parse(name string, data []byte) (*File, error) {
	if err := plainText(name, data); err != nil {
		return nil, err
	}
	root, err := parse(name, data)
	if err != nil {
		return nil, err
	}
	return newFile(name, string(data), root), nil
}

// Reopen reads again a text that was read before, to find the lines of its
// keys. A text that can't be read gives a file without keys, whose mistakes carry no line.
func Reopen(name, text string) *File {
	f, err := Parse(name, []byte(text))
	if err != nil {
		return newFile(name, text, newTable(0, byHeader))
	}
	return f
}

func newFile(name, text string, root *node) *File {
	f := &File{Name: name, Source: text}
	f.root = &Table{file: f, node: root, asked: map[string]bool{}, tables: map[string][]*Table{}}
	return f
}

// plainText refuses what is not plain UTF-8 text of a bearable size.
func plainText(name string, data []byte) error {
	fail := func(line int, format string, args ...any) error {
		return &Error{File: name, Line: line, Want: fmt.Sprintf(format, args...)}
	}
	switch {
	case len(data) > MaxSize:
		return fail(0, "is larger than 1 MB; a file of this kind has a few kB: is it the right one?")
	case len(bytes.TrimSpace(data)) == 0:
		return fail(0, "is empty; write a first one with: nightbench new DIR --example")
	case bytes.HasPrefix(data, []byte("\xef\xbb\xbf")):
		return fail(1, "begins with a byte order mark; save it as UTF-8 without one")
	case bytes.HasPrefix(data, []byte("\xff\xfe")), bytes.HasPrefix(data, []byte("\xfe\xff")):
		return fail(1, "is UTF-16; save it as UTF-8")
	}
	for i := 0; i < len(data); {
		r, n := utf8.DecodeRune(data[i:])
		if r == utf8.RuneError && n <= 1 {
			return fail(1+bytes.Count(data[:i], []byte("\n")), "byte %#02x is not UTF-8; save the file as UTF-8", data[i])
		}
		i += n
	}
	return nil
}

// Err is every mistake found so far, and every key that nobody asked for, in the order of lines; nil where all is well.
func (f *File) Err() error {
	unknown := f.unknown()
	var all Errors
	for _, e := range f.errs {
		if !explained(e, unknown) {
			all = append(all, &e.Error)
		}
	}
	for _, u := range unknown {
		all = append(all, &u.Error)
	}
	return all.byLine().err()
}

// Failed is every mistake found so far, without looking for unknown keys.
func (f *File) Failed() error {
	var all Errors
	for _, e := range f.errs {
		all = append(all, &e.Error)
	}
	return all.byLine().err()
}

// explained tells whether a missing key is there after all, misspelt.
func explained(e *failure, unknown []*failure) bool {
	for _, u := range unknown {
		if e.missing != "" && u.missing == e.missing && u.table == e.table {
			return true
		}
	}
	return false
}
