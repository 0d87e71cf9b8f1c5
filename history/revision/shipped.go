package revision

import (
	"errors"
	"fmt"
	"path/filepath"
)

// refuseShipped refuses a bare repository whose files another repository tracks: a
// commit brought them. Whoever stands in a folder of a data set would else be shown
// the history, and the ledger, that the author of a change has put there.
func (r *Repo) refuseShipped() error {
	if !r.at.itself || filepath.Base(r.at.gitDir) == ".git" {
		return nil // git lets no commit bring a file of that name
	}
	outer, err := Open(filepath.Dir(r.at.gitDir))
	if errors.Is(err, ErrNoRepository) {
		return nil
	}
	if err != nil {
		return err
	}
	defer outer.Close()
	tracked, err := outer.Tracked(filepath.Join(r.at.gitDir, "HEAD"))
	if err != nil || !tracked {
		return err
	}
	return &Error{
		Kind: ErrUnsupported, Text: fmt.Sprintf("the repository in the folder %q is part of what the repository around it tracks: a commit brought it", r.at.gitDir),
		Hint: fmt.Sprintf("name the one around it: --repo %q", filepath.Dir(r.at.gitDir)),
	}
}
