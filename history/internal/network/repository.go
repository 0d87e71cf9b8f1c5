package network

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"slices"
	"strings"
	"testing"
)

// Repository writes the network of a size with its three revisions into a new
// folder that lives as long as the test. It skips the test, with the reason,
// where the git program is absent; in CI that is a failure.
func Repository(tb testing.TB, s Size) (dir string) {
	tb.Helper()
	return written(tb, func(ctx context.Context, dir string) error { return Write(ctx, dir, s) })
}

// written has a repository written into a new folder, if there is a git program.
func written(tb testing.TB, write func(ctx context.Context, dir string) error) (dir string) {
	tb.Helper()
	if _, err := exec.LookPath("git"); err != nil {
		if os.Getenv("CI") == "true" {
			tb.Fatal(err)
		}
		tb.Skip("the git program is not installed")
	}
	dir = tb.TempDir()
	if err := write(context.Background(), dir); err != nil {
		tb.Fatal(err)
	}
	return dir
}

// Write writes the network of a size into an empty folder, with the files of
// Five checked out and everything in one pack.
func Write(ctx context.Context, dir string, s Size) error {
	return errors.Join(fastImport(ctx, dir, func(w io.Writer) { history(w, s) }),
		Git(ctx, dir, nil, "repack", "-adq"),
		Git(ctx, dir, nil, "reset", "-q", "--hard"))
}

// fastImport makes a repository of an empty folder from what write writes in the form
// that git fast-import reads.
func fastImport(ctx context.Context, dir string, write func(io.Writer)) error {
	if err := Git(ctx, dir, nil, "init", "-q", "-b", "main"); err != nil {
		return err
	}
	stream, w := io.Pipe()
	go func() {
		b := bufio.NewWriterSize(w, 1<<16)
		write(b)
		w.CloseWithError(b.Flush())
	}()
	err := Git(ctx, dir, stream, "fast-import", "--quiet", "--done")
	stream.Close() // ends the writer where git ended early
	return err
}

// Git runs the git program in a folder, untouched by the configuration and the
// environment of whoever runs the test.
func Git(ctx context.Context, dir string, stdin io.Reader, args ...string) error {
	c := Command(ctx, dir, args...)
	var stderr strings.Builder
	c.Stdin, c.Stderr = stdin, &stderr
	if err := c.Run(); err != nil {
		return fmt.Errorf("git %s: %w: %s", strings.Join(args, " "), err, strings.TrimSpace(stderr.String()))
	}
	return nil
}

// Command prepares the git program for Git. Its output is thrown away.
func Command(ctx context.Context, dir string, args ...string) *exec.Cmd {
	c := exec.CommandContext(ctx, "git", args...)
	c.Dir = dir
	c.Env = slices.DeleteFunc(os.Environ(), func(v string) bool { return strings.HasPrefix(v, "GIT_") })
	c.Env = append(c.Env, "GIT_CONFIG_GLOBAL="+os.DevNull, "GIT_CONFIG_NOSYSTEM=1", "GIT_PAGER=", "LC_ALL=C")
	return c
}

// history writes the three commits in the form that git fast-import reads.
func history(w io.Writer, s Size) {
	first := frame(s)
	var few, all []file
	for n := 1; n <= s.Routes; n++ {
		r := newRoute(s, n)
		first = append(first, r.files()...)
		r.editOne()
		all = append(all, r.files()...)
		if edited(s, n) {
			r = newRoute(s, n)
			r.editFew()
			few = append(few, r.files()...)
		}
	}
	commit(w, 1, 0, "main", "All routes", first)
	commit(w, 2, 1, "main", "Five routes", few)
	commit(w, 3, 1, "release", "Every route", all)
	for i, tag := range [...]string{Base, Five, All} {
		fmt.Fprintf(w, "reset refs/tags/%s\nfrom :%d\n\n", tag, i+1)
	}
	fmt.Fprint(w, "done\n")
}

// edited tells whether a route is one of the five, which lie evenly spread.
func edited(s Size, number int) bool {
	for k := range 5 {
		if number == 1+k*s.Routes/5 {
			return true
		}
	}
	return false
}

// commit writes one commit; parent 0 is none. Files that are not named are kept
// from the parent.
func commit(w io.Writer, mark, parent int, branch, message string, files []file) {
	fmt.Fprintf(w, "commit refs/heads/%s\nmark :%d\n", branch, mark)
	fmt.Fprintf(w, "committer Rowan Teal <r.teal@network.example> %d +0000\n", 1767225600+mark*86400)
	fmt.Fprintf(w, "data %d\n%s\n", len(message), message)
	if parent > 0 {
		fmt.Fprintf(w, "from :%d\n", parent)
	}
	for _, f := range files {
		fmt.Fprintf(w, "M 100644 inline %s\ndata %d\n%s\n", f.path, len(f.content), f.content)
	}
	fmt.Fprint(w, "\n")
}
