package revision

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strings"
	"syscall"

	"github.com/go-git/go-git/v5/plumbing"
)

const (
	maxPackedRefs    = 256 << 20 // bytes
	maxSymbolicDepth = 5         // references that are read in a row; git's own limit
)

// validRef applies the rules of git-check-ref-format(1) that keep a name inside
// the reference folder.
func validRef(name string) bool {
	if name == "" || len(name) > 4096 || strings.ContainsAny(name, " ~^:?*[\\\x7f") || strings.Contains(name, "..") ||
		strings.Contains(name, "@{") || strings.HasSuffix(name, ".") {
		return false
	}
	for i := range len(name) {
		if name[i] < ' ' {
			return false
		}
	}
	for part := range strings.SplitSeq(name, "/") {
		if part == "" || part[0] == '.' || strings.HasSuffix(part, ".lock") {
			return false
		}
	}
	return strings.HasPrefix(name, "refs/") || isPseudoRef(name)
}

// isPseudoRef accepts HEAD, FETCH_HEAD and the like, which lie beside the
// references.
func isPseudoRef(name string) bool {
	for i := range len(name) {
		if c := name[i]; c != '_' && (c < 'A' || c > 'Z') {
			return false
		}
	}
	return name == "HEAD" || strings.HasSuffix(name, "_HEAD")
}

// refDir is the folder a reference lies under: some belong to one worktree.
func (r *Repo) refDir(name string) string {
	for _, own := range []string{"refs/bisect/", "refs/worktree/", "refs/rewritten/"} {
		if strings.HasPrefix(name, own) {
			return r.at.gitDir
		}
	}
	if strings.HasPrefix(name, "refs/") {
		return r.at.commonDir
	}
	return r.at.gitDir
}

// ref gives what a full reference name points to, and false where there is no
// such reference. unborn is the branch that does not exist yet, if the name is
// symbolic and leads to one.
func (r *Repo) ref(name string) (h plumbing.Hash, ok bool, unborn string, err error) {
	for range maxSymbolicDepth {
		if !validRef(name) {
			return h, false, "", nil
		}
		text, err := readSmall(filepath.Join(r.refDir(name), filepath.FromSlash(name)))
		if err != nil {
			if isFolder(filepath.Join(r.refDir(name), filepath.FromSlash(name))) ||
				errors.Is(err, fs.ErrNotExist) || errors.Is(err, syscall.ENOTDIR) {
				h, ok, err := r.packedRef(name)
				if err == nil && !ok {
					unborn = name
				}
				return h, ok, unborn, err
			}
			return h, false, "", corrupt(fmt.Sprintf("reference %q cannot be read", name), err)
		}
		target, symbolic := strings.CutPrefix(text, "ref:")
		if symbolic {
			name = strings.TrimSpace(target)
			continue
		}
		// FETCH_HEAD has more behind the hash, and more lines.
		if len(text) >= 40 && (len(text) == 40 || strings.ContainsRune(" \t\r\n", rune(text[40]))) {
			if h, ok = parseHash(text[:40]); ok {
				return h, true, "", nil
			}
		}
		return h, false, "", corrupt(fmt.Sprintf("reference %q holds no hash", name), nil)
	}
	return h, false, "", corrupt(fmt.Sprintf("reference %q: too many references point to one another", name), nil)
}

func isFolder(name string) bool {
	info, err := os.Stat(name)
	return err == nil && info.IsDir()
}

// packedRef looks a name up in the packed references.
func (r *Repo) packedRef(name string) (plumbing.Hash, bool, error) {
	var hash plumbing.Hash
	found := false
	err := r.packedRefs(func(at string, h, _ plumbing.Hash) {
		if at == name {
			hash, found = h, true
		}
	})
	return hash, found, err
}

// packedRefs calls fn for each packed reference with its hash and, for an
// annotated tag whose target is recorded, that commit.
//
// The format: comment lines begin with '#'; a line is hash, space, name; a line
// of '^' and a hash belongs to the tag before it.
func (r *Repo) packedRefs(fn func(name string, h, peeled plumbing.Hash)) error {
	data, err := readBounded(filepath.Join(r.at.commonDir, "packed-refs"), maxPackedRefs)
	if errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	if err != nil {
		return corrupt("packed references cannot be read", err)
	}
	for len(data) > 0 {
		var line []byte
		line, data = cutLine(data)
		line = bytes.TrimSuffix(line, []byte("\r"))
		if len(line) == 0 || line[0] == '#' || line[0] == '^' {
			continue
		}
		if len(line) < 42 || line[40] != ' ' {
			return corrupt(fmt.Sprintf("packed references hold the malformed line %q", line), nil)
		}
		h, ok := parseHash(string(line[:40]))
		if !ok {
			return corrupt(fmt.Sprintf("packed references hold the malformed line %q", line), nil)
		}
		var peeled plumbing.Hash
		if len(data) > 41 && data[0] == '^' {
			peeled, _ = parseHash(string(data[1:41]))
		}
		fn(string(line[41:]), h, peeled)
	}
	return nil
}

// namedRef is a reference in a listing.
type namedRef struct {
	name         string
	hash, peeled plumbing.Hash // peeled may be zero
}

// listRefs gives the references below a prefix such as "refs/tags/" in byte
// order of their names. Broken ones are left out.
func (r *Repo) listRefs(prefix string) ([]namedRef, error) {
	found := map[string]namedRef{}
	err := r.packedRefs(func(name string, h, peeled plumbing.Hash) {
		if strings.HasPrefix(name, prefix) {
			found[name] = namedRef{name, h, peeled}
		}
	})
	if err != nil {
		return nil, err
	}
	root := filepath.Join(r.at.commonDir, filepath.FromSlash(path.Clean(prefix)))
	err = filepath.WalkDir(root, func(name string, d fs.DirEntry, err error) error {
		if errors.Is(err, fs.ErrNotExist) {
			return nil
		}
		if err != nil || d.IsDir() {
			return err
		}
		rel, err := filepath.Rel(r.at.commonDir, name)
		if err != nil {
			return err
		}
		full := filepath.ToSlash(rel)
		if h, ok, _, err := r.ref(full); err == nil && ok {
			found[full] = namedRef{name: full, hash: h}
		}
		return nil
	})
	if err != nil {
		return nil, corrupt("references cannot be listed", err)
	}
	out := make([]namedRef, 0, len(found))
	for _, ref := range found {
		out = append(out, ref)
	}
	slices.SortFunc(out, func(a, b namedRef) int { return strings.Compare(a.name, b.name) })
	return out, nil
}

// Describe gives a name that points exactly at a commit: the first tag in byte
// order, else the first branch, else the first remote-tracking branch, without
// "refs/tags/" and the like; "" if there is none or the references cannot be
// read. References are read once, at the first call.
func (r *Repo) Describe(c Commit) string {
	r.named.Do(func() { r.names, r.namedErr = r.nameCommits("refs/tags/", "refs/heads/", "refs/remotes/") })
	h, ok := parseHash(c.Hash)
	if !ok || r.namedErr != nil {
		return ""
	}
	return r.names[h]
}

// Names gives the tags, branches and remote-tracking branches as they are typed, for
// those who look for a name that is nearly theirs; what cannot be read is left out.
func (r *Repo) Names() []string {
	names := []string{"HEAD"}
	for _, prefix := range []string{"refs/tags/", "refs/heads/", "refs/remotes/"} {
		refs, err := r.listRefs(prefix)
		if err != nil {
			continue
		}
		for _, ref := range refs {
			names = append(names, strings.TrimPrefix(ref.name, prefix))
		}
	}
	return names
}

// Tags gives for the full hash of each commit that a tag points at the first such tag in
// byte order, without "refs/tags/". It is empty where the references cannot be read.
func (r *Repo) Tags() map[string]string {
	names, _ := r.nameCommits("refs/tags/")
	tags := make(map[string]string, len(names))
	for h, name := range names {
		tags[h.String()] = name
	}
	return tags
}

// nameCommits names commits by the references below some prefixes; of several the first.
func (r *Repo) nameCommits(prefixes ...string) (map[plumbing.Hash]string, error) {
	names := map[plumbing.Hash]string{}
	for _, prefix := range prefixes {
		refs, err := r.listRefs(prefix)
		if err != nil {
			return nil, err
		}
		for _, ref := range refs {
			short := strings.TrimPrefix(ref.name, prefix)
			if prefix == "refs/remotes/" && path.Base(short) == "HEAD" {
				continue
			}
			target := ref.peeled
			if target.IsZero() {
				if target, err = r.peel(ref.hash); err != nil {
					continue // a tag of something else, or of what is not here
				}
			}
			if _, ok := names[target]; !ok {
				names[target] = short
			}
		}
	}
	return names, nil
}
