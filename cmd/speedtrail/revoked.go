package main

import (
	"cmp"
	"fmt"
	"maps"
	"slices"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/approval"
	"speedtrail/history/signoff"
	"speedtrail/schema/source"
)

// revocationOf tells how a key was taken out of use; nil where it was not.
func revocationOf(line *approval.Line, fingerprint string) *render.Revocation {
	r, ok := line.Revoked(fingerprint)
	if !ok {
		return nil
	}
	return &render.Revocation{Entry: r.Entry.Seq, Reason: r.Reason, Recorded: r.Recorded.UTC().Format(signoff.TimeLayout), Signer: r.Signer}
}

// revokedOf lists those of some statements whose keys were revoked later.
func revokedOf(line *approval.Line, records []approval.Record) []render.RevokedSignOff {
	list := []render.RevokedSignOff{}
	for i := range records {
		if r := revocationOf(line, records[i].Fingerprint); r != nil {
			list = append(list, render.RevokedSignOff{Of: i, Revocation: *r})
		}
	}
	return list
}

// elsewhereOf tells where an older folder knows a signer without his key; nil where
// none does.
func elsewhereOf(line *approval.Line, r approval.Record) *render.Elsewhere {
	e := line.Elsewhere(r)
	if e == nil {
		return nil
	}
	return &render.Elsewhere{Anchor: e.Anchor, Folder: e.Folder}
}

// elsewhereBehind says so behind a signer in a list.
func elsewhereBehind(line *approval.Line, r approval.Record) string {
	if e := elsewhereOf(line, r); e != nil {
		return " (! " + e.Short() + ")"
	}
	return ""
}

// evidenceOf gives the statements by which a content of a folder is approved: those on
// assessments, and those of the anchor that has the content.
func evidenceOf(line *approval.Line, folder, content string, assessments []int64) []evidence {
	list := []evidence{}
	if a := line.Anchor(folder); a != nil && a.Content == content {
		list = evidenceOn(line, a.Records)
	}
	for _, number := range assessments {
		list = append(list, evidenceOn(line, line.State(number).Signed)...)
	}
	return list
}

// evidenceOn gives statements as evidence.
func evidenceOn(line *approval.Line, records []approval.Record) []evidence {
	list := []evidence{}
	for _, d := range records {
		decision := cmp.Or(d.Decision, string(d.Kind)) // an anchor decides nothing else
		list = append(list, evidence{d.Assessment, d.Entry.Seq, d.Role, decision, d.Signer, d.Fingerprint, elsewhereOf(line, d), revocationOf(line, d.Fingerprint), d.Time.Format(signoff.TimeLayout)})
	}
	return list
}

// toBeReviewed gives the evidence whose keys were revoked later, or are not those of the
// names in an older folder.
func toBeReviewed(all []evidence) []evidence {
	list := []evidence{}
	for _, e := range all {
		if e.Revoked != nil || e.Elsewhere != nil {
			list = append(list, e)
		}
	}
	return list
}

// toReview lists what a key signed, a line each, for those who took it out of use.
func toReview(line *approval.Line, fingerprint string) []string {
	var list []string
	anchors := line.Anchors()
	for _, folder := range slices.Sorted(maps.Keys(anchors)) {
		for _, r := range anchors[folder].Records {
			if r.Fingerprint == fingerprint {
				list = append(list, source.Visible(fmt.Sprintf("review the anchor of the folder %s, entry %d: %s signed it as %s", folder, r.Entry.Seq, r.Signer, r.Role)))
			}
		}
	}
	for _, r := range line.SignOffs() {
		if r.Fingerprint == fingerprint {
			list = append(list, source.Visible(fmt.Sprintf("review assessment %d: %s signed it as %s (%s) with this key, entry %d", r.Assessment, r.Signer, r.Role, r.Decision, r.Entry.Seq)))
		}
	}
	for _, r := range line.InForce() {
		if r.Fingerprint == fingerprint {
			list = append(list, source.Visible(fmt.Sprintf("review the record of what went into service of entry %d: %s signed it", r.Entry.Seq, r.Signer)))
		}
	}
	return list
}
