package revision

import (
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
)

// stream is the input of git fast-import(1), with which a whole history is
// written by one call.
type stream struct {
	strings.Builder
	marks int
}

// file is a file, link or submodule of a commit; an empty mode removes it.
type file struct{ path, mode, content string }

func (s *stream) data(text string) { fmt.Fprintf(s, "data %d\n%s\n", len(text), text) }

// person gives each number of a commit its own author or committer.
func person(n int, committer bool) (name, email string) {
	if committer {
		return "Bram Ostler", "b.ostler@fernway.example"
	}
	names := []string{"Wanda Quill", "Ødger Blåsup", "Mirela Tansey"}
	return names[n%3], fmt.Sprintf("writer%d@fernway.example", n%3)
}

// commit writes one commit at a time in seconds, with parents by their marks,
// and gives its mark. head is a further header line, such as an encoding.
func (s *stream) commit(ref string, when int, head, message string, parents []int, files ...file) int {
	s.marks++
	name, email := person(s.marks, false)
	fmt.Fprintf(s, "commit %s\nmark :%d\n", ref, s.marks)
	fmt.Fprintf(s, "author %s <%s> %d -0330\n", name, email, when-60)
	name, email = person(s.marks, true)
	fmt.Fprintf(s, "committer %s <%s> %d +0545\n", name, email, when)
	if head != "" {
		fmt.Fprintf(s, "%s\n", head)
	}
	s.data(message)
	for i, p := range parents {
		verb := "merge"
		if i == 0 {
			verb = "from"
		}
		fmt.Fprintf(s, "%s :%d\n", verb, p)
	}
	for _, f := range files {
		switch f.mode {
		case "":
			fmt.Fprintf(s, "D %q\n", f.path)
		case "160000":
			fmt.Fprintf(s, "M 160000 %s %q\n", f.content, f.path)
		default:
			fmt.Fprintf(s, "M %s inline %s\n", f.mode, quotePath(f.path))
			s.data(f.content)
		}
	}
	s.WriteByte('\n')
	return s.marks
}

// quotePath quotes as C does, byte by byte: git knows no \u.
func quotePath(p string) string {
	var b strings.Builder
	b.WriteByte('"')
	for i := range len(p) {
		switch c := p[i]; {
		case c == '"' || c == '\\':
			b.WriteByte('\\')
			b.WriteByte(c)
		case c < ' ' || c > '~':
			fmt.Fprintf(&b, "\\%03o", c)
		default:
			b.WriteByte(c)
		}
	}
	return b.String() + `"`
}

func (s *stream) tag(name string, mark int, message string) {
	fmt.Fprintf(s, "tag %s\nfrom :%d\ntagger Bram Ostler <b.ostler@fernway.example> 1767300000 +0000\n", name, mark)
	s.data(message)
}

func (s *stream) reset(ref string, mark int) { fmt.Fprintf(s, "reset %s\nfrom :%d\n\n", ref, mark) }

// load writes the stream into a repository as loose objects.
func (s *stream) load(g *gitRepo) {
	g.t.Helper()
	g.feed(s.String(), "-c", "fastimport.unpackLimit=10000", "fast-import", "--quiet", "--date-format=raw-permissive")
}

// table makes a long file of which a commit changes one line, so that packs hold
// it as a difference.
func table(changed int) string {
	var b strings.Builder
	b.WriteString("from_km,to_km,basic\n")
	for i := range 300 {
		speed := 40 + i*7%100
		if i < changed {
			speed += 5
		}
		fmt.Fprintf(&b, "%d.000,%d.000,%d\n", i, i+1, speed)
	}
	return b.String()
}

const someHash = "0123456789abcdef0123456789abcdef01234567"

// sample is a history with what a repository may hold: merges of two and of
// three, files of every mode, names that are not plain, and every kind of tag.
//
//	1 - 2 - 3 ----- 6 - 7 - 9 - 10   main
//	     \ - 4 - 5 /       /
//	      \ ----- 8 ------ (7 has 6, 5 and 8's parent 2: an octopus)
//	11                               a history of its own
//
// The objects of a sample lie in one pack. What a test gets is a copy of its own.
func sample(t testing.TB) *gitRepo {
	t.Helper()
	return copyOf(t, shared(t, true))
}

// looseSample is a sample whose objects are files of their own.
func looseSample(t testing.TB) *gitRepo {
	t.Helper()
	return copyOf(t, shared(t, false))
}

func copyOf(t testing.TB, from *gitRepo) *gitRepo {
	t.Helper()
	g := from.at(tempDir(t))
	if err := os.CopyFS(g.dir, os.DirFS(from.dir)); err != nil {
		t.Fatal(err)
	}
	return g
}

// shared is the sample itself, for tests that only read. TestMain makes sure
// that it was not changed.
func shared(t testing.TB, packed bool) *gitRepo {
	t.Helper()
	needGit(t)
	samples.once.Do(func() { buildSamples(t) })
	if samples.dir == "" {
		t.Fatal("the sample was not built")
	}
	name := "loose"
	if packed {
		name = "packed"
	}
	return &gitRepo{t, filepath.Join(samples.dir, name)}
}

// The samples are built once. TestMain removes them.
var samples struct {
	once  sync.Once
	dir   string
	state string // what state gave when they were built
}

// state lists all files below a folder with what shows that they were written to.
func state(dir string) (string, error) {
	var b strings.Builder
	err := fs.WalkDir(os.DirFS(dir), ".", func(name string, e fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		info, err := e.Info()
		if err == nil {
			fmt.Fprintln(&b, name, info.ModTime(), info.Mode(), info.Size())
		}
		return err
	})
	return b.String(), err
}

func buildSamples(t testing.TB) {
	t.Helper()
	dir, err := os.MkdirTemp("", "revision-sample")
	if err == nil {
		dir, err = filepath.EvalSymlinks(dir)
	}
	if err != nil {
		t.Fatal(err)
	}
	loose, packed := (&gitRepo{t, filepath.Join(dir, "loose")}), (&gitRepo{t, filepath.Join(dir, "packed")})
	samples.dir = dir // so that it is removed in any case
	buildSample(loose)
	if err := os.CopyFS(packed.dir, os.DirFS(loose.dir)); err != nil {
		t.Fatal(err)
	}
	packed.git("repack", "-adf", "--quiet")
	if samples.state, err = state(dir); err != nil {
		t.Fatal(err)
	}
}

func buildSample(g *gitRepo) {
	g.t.Helper()
	if err := os.Mkdir(g.dir, 0o755); err != nil {
		g.t.Fatal(err)
	}
	g.git("init", "--quiet", "--initial-branch=main")
	var s stream
	c1 := s.commit("refs/heads/main", 1767000000, "", "Start\n", nil,
		file{"network/speed.csv", "100644", table(0)},
		file{"network/routes/r1/route.toml", "100644", "id = \"R1\"\n"},
		file{"network/routes/r1.csv", "100644", "before the folder in Git's order\n"},
		file{"network/routes/r1-2", "100644", "between\n"},
		file{"network/tools/check", "100755", "#!/bin/sh\nexit 0\n"},
		file{"network/latest", "120000", "routes/r1"},
		file{"network/vendored", "160000", someHash},
		file{"network/empty.csv", "100644", ""},
		file{"network/bytes.bin", "100644", "\x00\xff\r\n\x00"},
		file{"network/Vägar/smal bro.csv", "100644", "ö\n"},
		file{"network/quote\"d\tand\\back", "100644", "x\n"},
		file{"elsewhere.txt", "100644", "not in the folder\n"},
	)
	c2 := s.commit("refs/heads/main", 1767001000, "", "Raise the first\n\nBody line one,\nline two.\n", []int{c1}, file{"network/speed.csv", "100644", table(1)})
	c3 := s.commit("refs/heads/main", 1767002000, "encoding ISO-8859-1", "Sm\xe5l bro\n\n\xd6ver \xe5n.\n", []int{c2}, file{"network/speed.csv", "100644", table(2)})
	c4 := s.commit("refs/heads/side", 1767001500, "", "Side one", []int{c2}, file{"network/side.csv", "100644", table(200)})
	c5 := s.commit("refs/heads/side", 1767002500, "", "Side two\r\nwith CRLF\r\n", []int{c4}, file{"network/side.csv", "100644", table(201)})
	c6 := s.commit("refs/heads/main", 1767003000, "", "Merge side\n", []int{c3, c5}, file{"network/side.csv", "100644", table(201)})
	c8 := s.commit("refs/heads/topic/deep", 1767002600, "", "Not UTF-8 \xff\xfe and no header\n", []int{c2}, file{"network/topic.csv", "100644", "t\n"})
	c7 := s.commit("refs/heads/main", 1767004000, "", "Octopus\n", []int{c6, c5, c8}, file{"network/topic.csv", "100644", "t\n"})
	c9 := s.commit("refs/heads/main", 1767005000, "", "\n\n  \nSubject after blank lines\ngoes on\n\nbody\n", []int{c7}, file{path: "network/topic.csv"}, file{"network/speed.csv", "100644", table(3)})
	c10 := s.commit("refs/heads/main", 1767006000, "", "", []int{c9}, file{"network/speed.csv", "100755", table(4)})
	c11 := s.commit("refs/heads/apart", 1767000500, "", "A history of its own\n", nil, file{"network/speed.csv", "100644", "other\n"})
	s.tag("v1", c2, "First release\n")
	s.tag("v2", c10, "Second release\n")
	s.reset("refs/tags/light", c3)
	s.reset("refs/remotes/origin/main", c9)
	s.reset("refs/remotes/origin/only-there", c11)
	s.reset("refs/notes/other", c1)
	s.load(g)
	g.git("symbolic-ref", "refs/remotes/origin/HEAD", "refs/remotes/origin/main")
	g.git("tag", "-a", "-m", "tag of a tag", "v1-again", "v1")
	g.git("tag", "-a", "-m", "tag of a tree", "a-tree", "main^{tree}")
	g.git("tag", "-a", "-m", "tag of a blob", "a-blob", "main:network/speed.csv")
	g.git("tag", "light-blob", "main:network/empty.csv")
	g.git("reset", "--quiet", "--hard", "main")
}
