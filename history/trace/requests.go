package trace

import (
	"context"
	"errors"
	"io/fs"
	"slices"

	"speedtrail/diff"
	"speedtrail/history/revision"
	"speedtrail/schema"
)

// Base gives the nearest commit before one, along first parents, whose data set
// loads; false where there is none.
func (h *History) Base(c int32) (int32, bool) {
	for {
		parents := h.Commits[c].Parents
		if len(parents) == 0 {
			return 0, false
		}
		if c = parents[0]; h.State[c] != Gap {
			return c, true
		}
	}
}

// Requests gives the change requests in play at a commit: those that were added
// or altered since its base. Only files that differ are read. Both data sets
// must load.
func Requests(ctx context.Context, repo *revision.Repo, folder string, base, commit Hash) ([]schema.ChangeRequest, error) {
	var sides [2]map[string]string // name -> identity
	var files [2]fs.FS
	var entries [2][]fs.DirEntry
	for i, hash := range [...]Hash{base, commit} {
		var err error
		if files[i], entries[i], err = requestFiles(repo, folder, hash); err != nil {
			return nil, err
		}
		sides[i] = map[string]string{}
		for _, e := range entries[i] {
			sides[i][e.Name()] = identityOf(e)
		}
	}
	var data [2]*schema.Dataset
	for i := range sides {
		m := newMount()
		m.plainFrame("")
		m.plainRoute()
		for _, e := range entries[i] {
			if sides[0][e.Name()] != sides[1][e.Name()] {
				m.request(e, files[i])
			}
		}
		if i == 1 && len(m.requests) == 0 {
			return nil, nil
		}
		var err error
		if data[i], err = schema.Load(ctx, m); err != nil {
			return nil, err
		}
	}
	return diff.RequestsInPlay(data[0], data[1]), nil
}

// requestFiles lists the folder of requests at a commit.
func requestFiles(repo *revision.Repo, folder string, commit Hash) (fs.FS, []fs.DirEntry, error) {
	files, err := repo.Snapshot(commit.String(), folder)
	if errors.Is(err, revision.ErrNoFolder) {
		return nil, nil, nil
	}
	if err != nil {
		return nil, nil, err
	}
	entries, err := fs.ReadDir(files, "requests")
	if errors.Is(err, fs.ErrNotExist) {
		return files, nil, nil
	}
	return files, entries, err
}

// Newest reads the reference trains of a commit whose data set loads, and one
// route by its folder: all of it, or only what its route.toml says.
func Newest(ctx context.Context, repo *revision.Repo, folder string, commit Hash, routeFolder string, whole bool) (*schema.Dataset, error) {
	files, err := repo.Snapshot(commit.String(), folder)
	if err != nil {
		return nil, err
	}
	root, err := fs.ReadDir(files, ".")
	if err != nil {
		return nil, err
	}
	m := newMount()
	for _, e := range root {
		if slices.Contains(frameFiles, e.Name()) || schema.NearlyNamed(e.Name(), e.IsDir()) {
			m.file(e, files)
		}
	}
	if !whole {
		m.plainRoute()
		data, err := schema.Load(ctx, m)
		if err != nil {
			return nil, err
		}
		route, err := schema.UnreadRoute(files, schema.Folder{Path: routeFolder})
		data.Routes = []*schema.Route{route}
		return data, err
	}
	routes, err := fs.ReadDir(files, "routes")
	if err != nil {
		return nil, err
	}
	for _, e := range routes {
		if "routes/"+e.Name() == routeFolder {
			m.folder(e, files)
		}
	}
	return schema.Load(ctx, m)
}
