package history_test

import (
	"bytes"
	"database/sql"
	"encoding/base64"
	"strconv"
	"strings"
	"time"

	"github.com/hiddeco/sshsig"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/canon"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
)

// append adds an entry without asking whether it is allowed: "KIND name=value
// ...". What the names mean is said in testdata/vectors/README.md.
func (x *tamperer) append(rest string) {
	x.t.Helper()
	word, rest, _ := strings.Cut(rest, " ")
	f := x.fields(rest)
	x.sql(func(db *sql.DB) {
		entries := x.entries(db)
		last := entries[len(entries)-1]
		recorded, err := time.Parse(chain.TimeLayout, last.Time)
		if err != nil {
			x.t.Fatal(err)
		}
		recorded = recorded.Add(time.Hour)
		if v := f.take("recorded", ""); v != "" {
			if recorded, err = time.Parse(chain.TimeLayout, v); err != nil {
				x.t.Fatal(err)
			}
		}
		e := chain.Entry{Seq: last.Seq + 1, Time: recorded.Format(chain.TimeLayout), Kind: chain.Kind(f.take("entry", word))}
		rows, number := f.take("rows", "yes"), f.take("number", "")
		switch copied, raw := f.take("copy", ""), f.take("body", ""); {
		case copied != "":
			e.Body = entries[x.number(copied)-1].Body
		case raw != "":
			e.Body = []byte(raw)
		default:
			e.Body = x.body(chain.Kind(word), f, entries, recorded)
		}
		for name := range f {
			x.t.Fatalf("append %s: %q has no meaning here", word, name)
		}
		e = linked(last.Head(), e)
		x.exec(db, "INSERT INTO entry VALUES (?, ?, ?, ?, ?, ?)", e.Seq, e.Time, string(e.Kind), e.Body, e.Previous, e.Hash)
		if rows == "yes" {
			x.rows(db, e, number)
		}
	})
}

// fields are the values of an append step by name.
type fields map[string]string

func (f fields) take(name, otherwise string) string {
	if v, ok := f[name]; ok {
		delete(f, name)
		return v
	}
	return otherwise
}

// fields reads "name=value" parts; a value with blanks stands in quotes, as Go
// writes them.
func (x *tamperer) fields(s string) fields {
	x.t.Helper()
	f := fields{}
	for s = strings.TrimSpace(s); s != ""; s = strings.TrimSpace(s) {
		name, after, ok := strings.Cut(s, "=")
		if !ok {
			x.t.Fatalf("%q is not name=value", s)
		}
		var value string
		if strings.HasPrefix(after, `"`) {
			quoted, err := strconv.QuotedPrefix(after)
			if err != nil {
				x.t.Fatalf("%s: %v", after, err)
			}
			value, _ = strconv.Unquote(quoted)
			s = after[len(quoted):]
		} else {
			value, s, _ = strings.Cut(after, " ")
		}
		f[name] = value
	}
	return f
}

// body makes the body of an entry.
func (x *tamperer) body(kind chain.Kind, f fields, entries []chain.Entry, recorded time.Time) []byte {
	x.t.Helper()
	head := entries[len(entries)-1].Head()
	var body any
	switch kind {
	case chain.Assessment:
		base, target, edit := f.take("base", ""), f.take("target", ""), f.take("edit", "")
		repo := newRepository()
		if v := f.take("policy", ""); v != "" { // of the base, as the forger would have it
			c := repo.commits[base]
			c.policy = v
			repo.commits[base] = c
		}
		b, _ := encoded(repo.document(base, target))
		return []byte(x.edit(string(b), edit))
	case chain.Anchor:
		a, err := anchorBody(f.take("commit", "a"), f.take("tree", "a"), f.take("folder", "."), f.take("policy", "P1"), head, recorded, strings.Split(f.take("sign", "checker:ada,approver:bea,in-service:cem"), ",")...)
		if err != nil {
			x.t.Fatal(err)
		}
		if v := f.take("format", ""); v != "" {
			a.Format = v
		}
		body = a
	default:
		body = x.signed(kind, f, entries, head, recorded)
	}
	b, err := canon.Marshal(body)
	if err != nil {
		x.t.Fatal(err)
	}
	return b
}

// edit replaces OLD=>NEW in a text.
func (x *tamperer) edit(text, edit string) string {
	x.t.Helper()
	if edit == "" {
		return text
	}
	old, replacement, ok := strings.Cut(edit, "=>")
	if !ok || !strings.Contains(text, old) {
		x.t.Fatalf("%q is not OLD=>NEW, or OLD is not in\n%s", edit, text)
	}
	return strings.Replace(text, old, replacement, 1)
}

// signed makes a statement and signs it.
func (x *tamperer) signed(kind chain.Kind, f fields, entries []chain.Entry, head chain.Head, recorded time.Time) approval.Signed {
	x.t.Helper()
	key := f.take("key", "")
	s := signoff.Statement{Ledger: ledgerID, Policy: policyHash("P2"), Folder: ".", Reason: "looked at it", Signer: ownerOf(key), Time: recorded, Head: head}
	var format string
	switch kind {
	case chain.SignOff:
		format = approval.SignOffFormat
		x.fillSignOff(&s, x.number(f.take("assessment", "")), entries)
		s.Role, s.Decision = f.take("role", ""), f.take("decision", signoff.Approve)
	case chain.InForce:
		format = approval.InForceFormat
		commit := f.take("commit", "c")
		s.Kind, s.Revision, s.Content = signoff.InForce, commitOf(commit), treeOf(x.repo.commits[commit].tree)
		s.Role, s.Corrects, s.Since = f.take("role", approval.InServiceRole), f.take("corrects", approval.CorrectsNothing), recorded
	case chain.Revocation:
		format = approval.RevocationFormat
		s.Kind, s.Key, s.Role = signoff.Revocation, fingerprint(f.take("revokes", "")), f.take("role", "")
	default:
		x.t.Fatalf("append %s is not known", kind)
	}
	edit, forge, signature := f.take("edit", ""), f.take("forge", ""), f.take("signature", "")
	format = f.take("format", format)
	b, err := s.Text()
	if err != nil {
		x.t.Fatal(err)
	}
	var lines []string
	for line := range strings.Lines(string(b)) {
		if name, _, ok := strings.Cut(line, ": "); ok && name != "key" {
			if v, ok := f[name]; ok {
				line = name + ": " + f.take(name, v) + "\n"
			}
		}
		lines = append(lines, line)
	}
	text := x.edit(strings.Join(lines, ""), edit)
	return approval.Signed{Format: format, Signature: x.signature(text, key, signature), Statement: x.edit(text, forge)}
}

// fillSignOff writes into a statement what an assessment of the ledger says.
func (x *tamperer) fillSignOff(s *signoff.Statement, number int64, entries []chain.Entry) {
	x.t.Helper()
	n := int64(0)
	for _, e := range entries {
		if e.Kind != chain.Assessment {
			continue
		}
		if n++; n != number {
			continue
		}
		doc, digest, err := assessment.Decode(e.Body)
		if err != nil {
			x.t.Fatal(err)
		}
		c := signOffOf(history.AssessmentOf(approval.New(ledgerID), number, digest, doc), "", "")
		c.Ledger, c.Reason, c.Signer, c.Time, c.Head = s.Ledger, s.Reason, s.Signer, s.Time, s.Head
		if c.Policy == "" {
			c.Policy = "none"
		}
		*s = c
		return
	}
	x.t.Fatalf("there is no assessment %d", number)
}

// signature signs a text, in one of several wrong ways.
func (x *tamperer) signature(text, key, how string) string {
	x.t.Helper()
	namespace, algorithm := signoff.Namespace, sshsig.HashSHA512
	switch how {
	case "namespace":
		namespace = "file"
	case "sha256":
		algorithm = sshsig.HashSHA256
	}
	s, err := sshsig.Sign(strings.NewReader(text), keyOf(key), algorithm, namespace)
	if err != nil {
		x.t.Fatal(err)
	}
	if claimed, ok := strings.CutPrefix(how, "claims:"); ok {
		s.PublicKey = keyOf(claimed).PublicKey()
		how = ""
	}
	good := armoured(s.Marshal(), 70)
	switch how {
	case "", "namespace", "sha256":
		return good
	case "empty":
		return ""
	case "twice":
		return good + good
	case "crlf":
		return strings.ReplaceAll(good, "\n", "\r\n")
	case "wrapped":
		return armoured(s.Marshal(), 64)
	case "flip":
		s.Signature.Blob = bytes.Clone(s.Signature.Blob)
		s.Signature.Blob[5] ^= 1
		return armoured(s.Marshal(), 70)
	case "rest":
		s.Signature.Rest = []byte{1, 0, 0, 0, 1}
		return armoured(s.Marshal(), 70)
	case "algorithm":
		s.Signature.Format = "ssh-rsa"
		return armoured(s.Marshal(), 70)
	case "base64":
		return strings.Replace(good, "U1NI", "U1N!", 1)
	}
	x.t.Fatalf("signature %q is not known", how)
	return ""
}

// armoured writes a signature in lines of a width; ssh-keygen takes 70.
func armoured(b []byte, width int) string {
	text := base64.StdEncoding.EncodeToString(b)
	out := "-----BEGIN SSH SIGNATURE-----\n"
	for len(text) > 0 {
		n := min(width, len(text))
		out, text = out+text[:n]+"\n", text[n:]
	}
	return out + "-----END SSH SIGNATURE-----\n"
}

// rows writes the rows that repeat an entry, as far as they can be made.
func (x *tamperer) rows(db *sql.DB, e chain.Entry, number string) {
	x.t.Helper()
	insert := func(table string, values ...any) {
		x.t.Helper()
		x.exec(db, "INSERT INTO "+table+" VALUES (?"+strings.Repeat(", ?", len(values)-1)+")", values...)
	}
	if e.Kind != chain.Assessment {
		rows, err := history.SignedRows(e)
		if err != nil {
			return
		}
		for _, r := range rows {
			insert(string(r.Table), append([]any{e.Seq}, r.Values...)...)
		}
		return
	}
	var n int64
	if err := db.QueryRow("SELECT max(number) + 1 FROM assessment").Scan(&n); err != nil {
		x.t.Fatal(err)
	}
	if number != "" {
		n = x.number(number)
	}
	doc, digest, err := assessment.Decode(e.Body)
	if err != nil {
		insert("assessment", n, e.Seq, "none", "none", "none", ".", "none", 2, 0, 0)
		return
	}
	r := assessment.LedgerRecord(doc, e.Body, digest)
	var changes []ledger.Change
	func() {
		defer func() { _ = recover() }() // what cannot be a row is left out
		for c := range r.Changes {
			changes = append(changes, c)
		}
	}()
	insert("assessment", n, e.Seq, r.Digest, r.Base, r.Target, r.Folder, r.Dataset, r.RulesVersion, len(changes), len(r.Findings))
	for i, q := range r.Requests {
		insert("request", n, i+1, q.ID, q.Title)
	}
	for i, p := range r.Preparers {
		insert("preparer", n, i+1, p.Name, p.Email)
	}
	for i, q := range r.Findings {
		insert("finding", n, i+1, q.ID, q.Route, q.Direction, q.From, q.To, q.Text, q.Accepted)
	}
	for i, c := range changes {
		insert("speed_change", n, i+1, c.Route, c.Direction, c.Train, c.From, c.To, c.LengthMM, c.Before, c.After, c.RunOut, c.BeforeSource, c.AfterSource)
	}
}
