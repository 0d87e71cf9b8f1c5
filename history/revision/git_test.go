package revision

import (
	"bytes"
	"compress/zlib"
	"crypto/sha1"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
)

// The tests build repositories with the git program and ask it for the truth.
// Both it and this package see an environment in which nothing of the user or of
// the machine has a say.

func TestMain(m *testing.M) {
	os.Exit(runClean(m))
}

func runClean(m *testing.M) int {
	home, err := os.MkdirTemp("", "revision-home")
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		return 1
	}
	defer os.RemoveAll(home)
	for _, line := range os.Environ() {
		if name, _, _ := strings.Cut(line, "="); strings.HasPrefix(name, "GIT_") {
			os.Unsetenv(name)
		}
	}
	for name, value := range map[string]string{
		"HOME":                home,
		"XDG_CONFIG_HOME":     filepath.Join(home, "xdg"),
		"GIT_CONFIG_NOSYSTEM": "1",
		"GIT_CONFIG_GLOBAL":   os.DevNull,
		"GIT_TERMINAL_PROMPT": "0",
		// This package ignores replace refs, so git must, to be asked for the truth.
		"GIT_NO_REPLACE_OBJECTS": "1",
		// What later versions of git may take as their default.
		"GIT_DEFAULT_HASH":       "sha1",
		"GIT_DEFAULT_REF_FORMAT": "files",
		"GIT_AUTHOR_NAME":        "Wanda Quill",
		"GIT_AUTHOR_EMAIL":       "w.quill@fernway.example",
		"GIT_AUTHOR_DATE":        "1767261600 +0100",
		"GIT_COMMITTER_NAME":     "Bram Ostler",
		"GIT_COMMITTER_EMAIL":    "b.ostler@fernway.example",
		"GIT_COMMITTER_DATE":     "1767265200 +0000",
		"LC_ALL":                 "C",
		// What is of no use to a repository that is gone in a moment.
		"GIT_CONFIG_COUNT":   "2",
		"GIT_CONFIG_KEY_0":   "core.fsync",
		"GIT_CONFIG_VALUE_0": "none",
		"GIT_CONFIG_KEY_1":   "maintenance.auto",
		"GIT_CONFIG_VALUE_1": "false",
		"TZ":                 "UTC",
		// An empty folder: nothing is copied into a new repository.
		"GIT_TEMPLATE_DIR": filepath.Join(home, "template"),
	} {
		os.Setenv(name, value)
	}
	if err := os.Mkdir(filepath.Join(home, "template"), 0o755); err != nil {
		fmt.Fprintln(os.Stderr, err)
		return 1
	}
	defer func() { os.RemoveAll(samples.dir) }()
	code := m.Run()
	if samples.state != "" {
		if now, err := state(samples.dir); err != nil || now != samples.state {
			fmt.Fprintln(os.Stderr, "a test wrote to the shared samples", err)
			return 1
		}
	}
	return code
}

// needGit skips a test where there is no git program. On the build server that
// is a failure.
func needGit(t testing.TB) {
	t.Helper()
	if _, err := exec.LookPath("git"); err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal("the git program is needed here")
		}
		t.Skip("no git program on this machine")
	}
}

// gitRepo is a repository on disk that the git program writes.
type gitRepo struct {
	t   testing.TB
	dir string
}

// tempDir is t.TempDir with links resolved, as git and this package print paths.
func tempDir(t testing.TB) string {
	t.Helper()
	dir, err := filepath.EvalSymlinks(t.TempDir())
	if err != nil {
		t.Fatal(err)
	}
	return dir
}

// newGit makes an empty repository with a working tree.
func newGit(t testing.TB, options ...string) *gitRepo {
	t.Helper()
	needGit(t)
	g := &gitRepo{t, tempDir(t)}
	g.git(append([]string{"init", "--quiet", "--initial-branch=main"}, options...)...)
	return g
}

// at is the same helper for another folder.
func (g *gitRepo) at(dir string) *gitRepo { return &gitRepo{g.t, dir} }

func (g *gitRepo) run(stdin string, args ...string) (string, error) {
	c := exec.Command("git", args...)
	c.Dir = g.dir
	c.Stdin = strings.NewReader(stdin)
	var out, errs bytes.Buffer
	c.Stdout, c.Stderr = &out, &errs
	if err := c.Run(); err != nil {
		return out.String(), fmt.Errorf("git %s: %w\n%s", strings.Join(args, " "), err, errs.String())
	}
	return out.String(), nil
}

// try runs git and gives its output without the newline at the end.
func (g *gitRepo) try(args ...string) (string, error) {
	out, err := g.run("", args...)
	return strings.TrimSuffix(out, "\n"), err
}

// git is try for a command that must succeed.
func (g *gitRepo) git(args ...string) string {
	g.t.Helper()
	return g.feed("", args...)
}

// feed is git with a standard input.
func (g *gitRepo) feed(stdin string, args ...string) string {
	g.t.Helper()
	out, err := g.run(stdin, args...)
	if err != nil {
		g.t.Fatal(err)
	}
	return strings.TrimSuffix(out, "\n")
}

// said keeps what git says of objects by their whole hashes, which is the same in
// every repository, for all tests.
var said sync.Map

type saying struct {
	once   sync.Once
	out    string
	status int
}

// told is feed for a command whose arguments and input name objects by their
// whole hashes alone: of several repositories with the same objects one is asked.
// It also gives the exit status.
func (g *gitRepo) told(stdin string, args ...string) (string, int) {
	g.t.Helper()
	key := strings.Join(args, "\x00") + "\x00\x00" + stdin
	kept, _ := said.LoadOrStore(key, &saying{status: -1})
	s := kept.(*saying)
	s.once.Do(func() {
		out, err := g.run(stdin, args...)
		var exit *exec.ExitError
		switch {
		case err == nil:
			s.status = 0
		case errors.As(err, &exit):
			s.status = exit.ExitCode()
		}
		s.out = strings.TrimSuffix(out, "\n")
	})
	if s.status != 0 && s.status != 1 {
		said.Delete(key)
		g.t.Fatalf("git %s: status %d", strings.Join(args, " "), s.status)
	}
	return s.out, s.status
}

// tell is told for a command that must succeed.
func (g *gitRepo) tell(stdin string, args ...string) string {
	g.t.Helper()
	out, status := g.told(stdin, args...)
	if status != 0 {
		said.Delete(strings.Join(args, "\x00") + "\x00\x00" + stdin)
		g.t.Fatalf("git %s: status %d", strings.Join(args, " "), status)
	}
	return out
}

// code gives git's exit status.
func (g *gitRepo) code(args ...string) int {
	g.t.Helper()
	_, err := g.run("", args...)
	var exit *exec.ExitError
	if err != nil && !errors.As(err, &exit) {
		g.t.Fatal(err)
	}
	if exit == nil {
		return 0
	}
	return exit.ExitCode()
}

func (g *gitRepo) path(name string) string { return filepath.Join(g.dir, filepath.FromSlash(name)) }

// write writes a file of the working tree and the folders above it.
func (g *gitRepo) write(name, content string) {
	g.t.Helper()
	writeFile(g.t, g.path(name), content)
}

func writeFile(t testing.TB, name, content string) {
	t.Helper()
	err := os.WriteFile(name, []byte(content), 0o644)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		if err = os.MkdirAll(filepath.Dir(name), 0o755); err == nil {
			err = os.WriteFile(name, []byte(content), 0o644)
		}
	case errors.Is(err, fs.ErrPermission):
		// Git's own files are often read-only.
		if err = os.Chmod(name, 0o644); err == nil {
			err = os.WriteFile(name, []byte(content), 0o644)
		}
	}
	if err != nil {
		t.Fatal(err)
	}
}

func readFile(t testing.TB, name string) string {
	t.Helper()
	data, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	return string(data)
}

// symlink makes a link, or skips the test where the system has none.
func (g *gitRepo) symlink(target, name string) {
	g.t.Helper()
	if err := os.MkdirAll(filepath.Dir(g.path(name)), 0o755); err != nil {
		g.t.Fatal(err)
	}
	if err := os.Symlink(target, g.path(name)); err != nil {
		g.t.Skip("no symbolic links here:", err)
	}
}

// commit adds every file and commits.
func (g *gitRepo) commit(message string) string {
	g.t.Helper()
	g.git("add", "--all")
	g.git("commit", "--quiet", "--allow-empty", "-m", message)
	return g.git("rev-parse", "HEAD")
}

// object writes any object, well formed or not, as a loose one.
func (g *gitRepo) object(kind, content string) string {
	g.t.Helper()
	hash := sumOf(kind, content)
	if _, err := os.Stat(g.loose(hash)); err != nil {
		writeFile(g.t, g.loose(hash), deflate(fmt.Sprintf("%s %d\x00%s", kind, len(content), content)))
	}
	return hash
}

func deflate(s string) string {
	var b bytes.Buffer
	z := zlib.NewWriter(&b)
	io.WriteString(z, s)
	z.Close()
	return b.String()
}

// loose is the path of a loose object.
func (g *gitRepo) loose(hash string) string {
	return g.path(".git/objects/" + hash[:2] + "/" + hash[2:])
}

// open opens the repository with this package.
func (g *gitRepo) open() *Repo {
	g.t.Helper()
	return openDir(g.t, g.dir)
}

func openDir(t testing.TB, dir string) *Repo {
	t.Helper()
	r, err := Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { r.Close() })
	return r
}

// wantClass checks the class of an error and that its text names things.
func wantClass(t testing.TB, err, class error, parts ...string) {
	t.Helper()
	if !errors.Is(err, class) {
		t.Errorf("error %v, want one of class %q", err, class)
		return
	}
	for _, other := range []error{
		ErrNoRepository, ErrUnsupported, ErrUnknown, ErrAmbiguous, ErrNotCommit, ErrMissingObject, ErrShallow, ErrCorrupt,
		ErrNoFolder, ErrBare, ErrNotFile, ErrTooLarge, ErrUnreadable,
	} {
		if other != class && errors.Is(err, other) {
			t.Errorf("error %v is also of class %q", err, other)
		}
	}
	for _, p := range parts {
		if !strings.Contains(err.Error(), p) {
			t.Errorf("error %q does not say %q", err, p)
		}
	}
}

func lines(s string) []string {
	if s == "" {
		return nil
	}
	return strings.Split(strings.TrimSuffix(s, "\n"), "\n")
}

// split cuts git's -z output.
func split(s string) []string {
	if s == "" {
		return nil
	}
	return strings.Split(strings.TrimSuffix(s, "\x00"), "\x00")
}

// sumOf is the hash of an object, computed without this package.
func sumOf(kind, content string) string {
	return fmt.Sprintf("%x", sha1.Sum(fmt.Appendf(nil, "%s %d\x00%s", kind, len(content), content)))
}
