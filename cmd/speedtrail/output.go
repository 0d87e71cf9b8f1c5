package main

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/schema/source"
)

// outputFlags adds --format and --out to a command. The first format is the
// default.
func (a *app) outputFlags(c *cobra.Command, formats ...string) {
	c.Flags().StringVar(&a.format, "format", formats[0], strings.Join(formats, ", "))
	c.Flags().StringVarP(&a.outTo, "out", "o", "", "write the result to a `file`, whole or not at all; its ending can choose the format")
	c.PreRunE = func(c *cobra.Command, _ []string) error {
		if !c.Flags().Changed("format") {
			// The flags of all commands are one variable, and have the default of the
			// last of them so far.
			a.format = formats[0]
			if f := formatOf(a.outTo); slices.Contains(formats, f) {
				a.format = f
			} else if f != "" {
				return badCall("choose with --format: "+strings.Join(formats, ", "), "the ending of %s is that of no format", source.Quote(a.outTo))
			}
		}
		if !slices.Contains(formats, a.format) {
			return badCall(meant(a.format, formats, "--format is one of "+strings.Join(formats, ", ")), "unknown value %q for --format", a.format)
		}
		return nil
	}
}

// formatOf guesses a format from a file's name.
func formatOf(name string) string {
	switch ending := strings.ToLower(strings.TrimPrefix(filepath.Ext(name), ".")); ending {
	case "htm":
		return "html"
	case "md":
		return "markdown"
	case "txt":
		return "text"
	default:
		return ending
	}
}

// write gives the result to standard output, or to the file of --out: into a
// new file beside it that takes its place only when all of it is on the disk.
func (a *app) write(result func(io.Writer) error) error {
	a.endProgress()
	if a.outTo == "" {
		b := bufio.NewWriterSize(a.out, 1<<16)
		if err := result(b); err != nil {
			return err
		}
		return wrote("standard output", b.Flush())
	}
	return wrote(a.outTo, writeFile(a.outTo, result))
}

func wrote(name string, err error) error {
	if err == nil {
		return nil
	}
	return &unwritten{name, err}
}

// unwritten is a result that could not be written.
type unwritten struct {
	name string
	err  error
}

func (e *unwritten) Error() string { return e.name + " was not written: " + e.err.Error() }

func (e *unwritten) Unwrap() error { return e.err }

// Hint says what to do.
func (e *unwritten) Hint() string {
	if errors.Is(e.err, fs.ErrNotExist) {
		return "make the folder first, or name one that is there"
	}
	return hintOf(e.err)
}

// writeFile replaces a file by what result writes, or leaves it as it was. Who may
// read it is as it was, or as the user has it for new files.
func writeFile(name string, result func(io.Writer) error) (err error) {
	before, err := os.Stat(name)
	if err == nil && !before.Mode().IsRegular() {
		if before.IsDir() {
			return errors.New("it is a folder")
		}
		// A device or a pipe cannot be replaced, only written to.
		f, err := os.OpenFile(name, os.O_WRONLY, 0)
		if err != nil {
			return err
		}
		return errors.Join(result(f), f.Close())
	}
	there := err == nil
	f, err := createBeside(name)
	if err != nil {
		var inner *fs.PathError
		if errors.As(err, &inner) { // the name of the new file tells nobody anything
			err = fmt.Errorf("folder %s: %w", source.Quote(filepath.Dir(name)), inner.Err)
		}
		return err
	}
	defer func() {
		if err != nil {
			f.Close()
			os.Remove(f.Name())
		}
	}()
	b := bufio.NewWriterSize(f, 1<<16)
	if err = result(b); err != nil {
		return err
	}
	if err = b.Flush(); err != nil {
		return err
	}
	if there {
		if err = f.Chmod(before.Mode().Perm()); err != nil {
			return err
		}
	}
	if err = f.Sync(); err != nil {
		return err
	}
	if err = f.Close(); err != nil {
		return err
	}
	return os.Rename(f.Name(), name)
}

// createBeside makes a new file beside another one. (os.CreateTemp makes one that
// nobody else may read.)
func createBeside(name string) (f *os.File, err error) {
	for range 100 {
		beside := fmt.Sprintf(".%s.%d", filepath.Base(name), rand.Uint32())
		f, err = os.OpenFile(filepath.Join(filepath.Dir(name), beside), os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
		if !errors.Is(err, fs.ErrExist) {
			break
		}
	}
	return f, err
}

// writeBytes is writeFile for what is there already.
func writeBytes(name string, content []byte) error {
	return writeFile(name, func(w io.Writer) error {
		_, err := w.Write(content)
		return err
	})
}

// style is how text looks where it goes to.
func (a *app) style() render.Style {
	s := render.Style{Width: 80, Color: a.color == "always"}
	if a.outTo == "" { // a file is read elsewhere, and is the same whoever writes it from where
		s.Advise = a.advise
	}
	f, ok := a.out.(*os.File)
	if !ok || a.outTo != "" || !term.IsTerminal(int(f.Fd())) {
		return s
	}
	if width, _, err := term.GetSize(int(f.Fd())); err == nil && width > 0 {
		s.Width = width
	}
	if a.color == "auto" {
		s.Color = os.Getenv("NO_COLOR") == "" && os.Getenv("TERM") != "dumb"
	}
	return s
}

// remark tells the user something beside the result.
func (a *app) remark(format string, args ...any) {
	if a.quiet {
		return
	}
	a.endProgress()
	fmt.Fprintln(a.err, a.fitted(source.VisibleLines(fmt.Sprintf(format, args...))))
}

// fitted wraps a text for the terminal to which errors and remarks go, else it is left
// alone: a program that reads them finds each in one line.
func (a *app) fitted(text string) string {
	f, ok := a.err.(*os.File)
	if !ok || !term.IsTerminal(int(f.Fd())) {
		return text
	}
	width, _, err := term.GetSize(int(f.Fd()))
	if err != nil || width <= 0 {
		return text
	}
	lines := strings.Split(text, "\n")
	for i, line := range lines {
		if !strings.HasPrefix(line, " ") { // what is set in was laid out
			lines[i] = render.Hanging(line, width, "  ")
		}
	}
	return strings.Join(lines, "\n")
}
