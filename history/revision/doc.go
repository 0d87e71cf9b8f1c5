// Package revision reads Git repositories: it finds the repository around a
// folder, resolves what a user calls a revision to a commit, walks from commit to
// commit, and gives the files of a data set folder at a commit or on disk as an
// fs.FS. It never writes, never runs the git program and uses no network.
//
//	repo, err := revision.Open(".")
//	if err != nil {
//		return err
//	}
//	defer repo.Close()
//	commit, err := repo.Resolve("HEAD~2")
//	if err != nil {
//		return err
//	}
//	data, err := repo.Snapshot(commit.Hash, "data")
//	if err != nil {
//		return err
//	}
//	files, err := fs.ReadDir(data, "routes")
//
// # What the file systems promise
//
// Entries come sorted by name. Every fs.DirEntry and fs.FileInfo is an [Entry]:
// its Identity is the hash that Git has, or would have, for that file or folder,
// so two entries with the same mode and an equal, non-empty Identity have equal
// content and need not be read. Symbolic links are never followed below the data
// set folder: they come as fs.ModeSymlink, submodules as fs.ModeIrregular, and
// opening one is an error. The size of a file is known before its content is read.
// Both file systems may be used by any number of goroutines at once.
//
// # What is checked
//
// Every object is checked against its hash when it is read to its end; a
// mismatch is an error of class [ErrCorrupt]. Trees and commits are parsed
// strictly: a tree that Git would not write is refused. Sizes, depths and counts
// are bounded.
//
// # What is refused
//
// SHA-256 repositories, reference storage other than files, extensions that this
// package does not know, split and sparse index files, pack indexes of version 1
// (see [ErrUnsupported]). A shallow clone is read; a walk that would go past its
// end says so ([ErrShallow]). An object that a partial clone lacks is told from a
// path that is not there ([ErrMissingObject]). What the system refuses to show is
// neither missing nor damaged ([ErrUnreadable]). An alternate object folder that
// is not there counts only once an object is missing, whose error then names it.
//
// A file or folder whose name is not UTF-8 is listed, as it is there, but fs.FS
// has no path to it: to ask for it is an error of class [ErrNotFile], which is
// fs.ErrInvalid, too, and has the name escaped.
//
// # What differs from the git program
//
// Replace refs (refs/replace), grafts and mailmap are ignored: an account of
// what was released must rest on the objects themselves. safe.directory is not
// honoured, as nothing that the repository configures is run. The environment
// variables GIT_DIR, GIT_WORK_TREE and the like are not read. A name that is
// both a tag and a branch, on different commits, is refused where git warns and
// takes the tag. Content filters (autocrlf, smudge and clean) are not applied:
// the working tree is taken as its bytes on disk.
package revision
