package main

import (
	"context"

	"speedtrail/history/trace"
	"speedtrail/schema"
)

// requestsAt gives the change requests in play at a commit.
func (t *tracing) requestsAt(ctx context.Context, c int32) ([]schema.ChangeRequest, error) {
	if list, ok := t.requests[c]; ok {
		return list, nil
	}
	var list []schema.ChangeRequest
	if base, ok := t.h.Base(c); ok {
		var err error
		if list, err = trace.Requests(ctx, t.repo, t.folder, t.h.Commits[base].Hash, t.h.Commits[c].Hash); err != nil {
			return nil, err
		}
	}
	if t.requests == nil {
		t.requests = map[int32][]schema.ChangeRequest{}
	}
	t.requests[c] = list
	return list, nil
}

// declaredBy names the requests in play at a commit that declare what changed there.
func (t *tracing) declaredBy(ctx context.Context, c int32, declares func(*schema.ChangeRequest) bool) ([]string, error) {
	list := []string{}
	requests, err := t.requestsAt(ctx, c)
	for i := range requests {
		if declares(&requests[i]) {
			list = append(list, requests[i].ID)
		}
	}
	return list, err
}
