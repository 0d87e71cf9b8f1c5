package history_test

import (
	"bytes"
	"database/sql"
	"encoding/hex"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	_ "github.com/mattn/go-sqlite3" // the driver "sqlite3"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/canon"
	"speedtrail/history/chain"
)

// tamperer does what somebody can do who may write the ledger's file, and what
// may have become of the repository.
type tamperer struct {
	t    *testing.T
	g    *good
	file string
	repo *repository
	o    history.VerifyOptions
}

// signedOf gives the signed statement of an entry.
func signedOf(e chain.Entry) (s approval.Signed, err error) {
	if e.Kind != chain.SignOff && e.Kind != chain.InForce && e.Kind != chain.Revocation {
		return s, errors.New("none")
	}
	return s, canon.Unmarshal(e.Body, &s)
}

func (x *tamperer) step(line string) {
	x.t.Helper()
	word, rest, _ := strings.Cut(line, " ")
	rest = x.g.values(rest)
	args := strings.Fields(rest)
	need := func(n int) {
		x.t.Helper()
		if len(args) != n {
			x.t.Fatalf("%q: %d arguments are needed", line, n)
		}
	}
	switch word {
	case "sql":
		x.sql(func(db *sql.DB) { x.exec(db, rest) })
	case "raw":
		x.raw(func(db *sql.DB) { x.exec(db, rest) })
	case "append":
		x.append(rest)
	case "rechain":
		need(1)
		x.sql(func(db *sql.DB) { x.rechain(db, x.number(args[0])) })
	case "truncate":
		need(1)
		x.sql(func(db *sql.DB) {
			for _, table := range dependants {
				x.exec(db, "DELETE FROM "+table+" WHERE entry > ?", args[0])
			}
			for _, table := range ofAssessment {
				x.exec(db, "DELETE FROM "+table+" WHERE assessment IN (SELECT number FROM assessment WHERE entry > ?)", args[0])
			}
			x.exec(db, "DELETE FROM assessment WHERE entry > ?", args[0])
			x.exec(db, "DELETE FROM entry WHERE seq > ?", args[0])
		})
	case "remove":
		need(1)
		x.sql(func(db *sql.DB) {
			for _, table := range dependants {
				x.exec(db, "DELETE FROM "+table+" WHERE entry = ?", args[0])
			}
			x.exec(db, "DELETE FROM entry WHERE seq = ?", args[0])
		})
	case "move": // an entry with its rows to another number that is free
		need(2)
		x.sql(func(db *sql.DB) { x.move(db, x.number(args[0]), x.number(args[1])) })
	case "swap":
		need(2)
		a, b := x.number(args[0]), x.number(args[1])
		x.sql(func(db *sql.DB) { x.move(db, a, 9999); x.move(db, b, a); x.move(db, 9999, b) })
	case "close": // the numbers after a removed one go down by one
		need(1)
		x.sql(func(db *sql.DB) {
			for n := x.number(args[0]) + 1; n <= x.last(db); n++ {
				x.move(db, n, n-1)
			}
		})
	case "open": // the numbers from one on go up by one
		need(1)
		x.sql(func(db *sql.DB) {
			for n := x.last(db); n >= x.number(args[0]); n-- {
				x.move(db, n, n+1)
			}
		})
	case "bytes":
		need(2)
		x.bytes(args[0], args[1])
	case "cut":
		need(1)
		if err := os.Truncate(x.file, x.number(args[0])); err != nil {
			x.t.Fatal(err)
		}
	case "file":
		content, err := strconv.Unquote(rest)
		if err != nil {
			x.t.Fatal(err)
		}
		x.replace([]byte(content))
	case "fresh": // a ledger of the same entries but for the first, which is another
		need(1)
		x.sql(func(db *sql.DB) {
			x.exec(db, "UPDATE entry SET body = ? WHERE seq = 1", []byte(args[0]))
			x.rechain(db, 1)
		})
	case "git":
		x.git(args)
	case "against":
		need(1)
		h, err := chain.ParseHead(args[0])
		if err != nil {
			x.t.Fatal(err)
		}
		x.o.Against = append(x.o.Against, h)
	case "anchor":
		need(1)
		x.o.Anchors = append(x.o.Anchors, args[0])
	case "ledger-only":
		x.o.Checker = nil
	default:
		x.t.Fatalf("step %q is not known", line)
	}
}

// The tables that belong to entries and to assessments.
var (
	dependants   = []string{"anchor", "sign_off", "in_force", "revocation"}
	ofAssessment = []string{"request", "preparer", "finding", "speed_change"}
)

func (x *tamperer) number(s string) int64 {
	x.t.Helper()
	n, err := strconv.ParseInt(s, 10, 64)
	if err != nil {
		x.t.Fatal(err)
	}
	return n
}

func (x *tamperer) exec(db *sql.DB, statement string, args ...any) {
	x.t.Helper()
	if _, err := db.Exec(statement, args...); err != nil {
		x.t.Fatalf("%s: %v", statement, err)
	}
}

// raw opens the file as any program can.
func (x *tamperer) raw(work func(db *sql.DB)) {
	x.t.Helper()
	db, err := sql.Open("sqlite3", "file:"+filepath.ToSlash(x.file)+"?_foreign_keys=off&_synchronous=off")
	if err != nil {
		x.t.Fatal(err)
	}
	defer db.Close()
	db.SetMaxOpenConns(1)
	work(db)
}

// sql does the same with the triggers out of the way, and puts them back.
func (x *tamperer) sql(work func(db *sql.DB)) {
	x.t.Helper()
	x.raw(func(db *sql.DB) {
		x.exec(db, "BEGIN")
		rows, err := db.Query("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger' ORDER BY name")
		if err != nil {
			x.t.Fatal(err)
		}
		var names, texts []string
		for rows.Next() {
			var name, text string
			if err := rows.Scan(&name, &text); err != nil {
				x.t.Fatal(err)
			}
			names, texts = append(names, name), append(texts, text)
		}
		rows.Close()
		for _, name := range names {
			x.exec(db, "DROP TRIGGER "+name)
		}
		work(db)
		for _, text := range texts {
			x.exec(db, text)
		}
		x.exec(db, "COMMIT")
	})
}

// entries reads all entries, in the order of their numbers.
func (x *tamperer) entries(db *sql.DB) []chain.Entry {
	x.t.Helper()
	rows, err := db.Query("SELECT seq, time, kind, body, previous, hash FROM entry ORDER BY seq")
	if err != nil {
		x.t.Fatal(err)
	}
	defer rows.Close()
	var list []chain.Entry
	for rows.Next() {
		var e chain.Entry
		if err := rows.Scan(&e.Seq, &e.Time, &e.Kind, &e.Body, &e.Previous, &e.Hash); err != nil {
			x.t.Fatal(err)
		}
		list = append(list, e)
	}
	return list
}

// rechain computes the chain anew from an entry on: anyone can, it has no key.
func (x *tamperer) rechain(db *sql.DB, from int64) {
	x.t.Helper()
	head := chain.Head{}
	x.exec(db, "UPDATE entry SET previous = 'p' || seq, hash = 'h' || seq WHERE seq >= ?", from)
	for _, e := range x.entries(db) {
		if e.Seq >= from {
			e = linked(head, e)
			x.exec(db, "UPDATE entry SET previous = ?, hash = ? WHERE seq = ?", e.Previous, e.Hash, e.Seq)
		}
		head = e.Head()
	}
}

// linked gives an entry the hashes that it needs to follow a head, by the formula
// of the ledger's documentation and not by the program's code.
func linked(head chain.Head, e chain.Entry) chain.Entry {
	e.Previous = head.Hash
	if head.Seq == 0 {
		e.Previous = strings.Repeat("0", 64)
	}
	e.Hash = hexOf(fmt.Sprintf("speedtrail-entry 1\n%d\n%s\n%s\n%s\n%s\n", e.Seq, e.Time, e.Kind, hexOf(string(e.Body)), e.Previous))
	return e
}

func (x *tamperer) move(db *sql.DB, from, to int64) {
	x.t.Helper()
	x.exec(db, "UPDATE entry SET seq = ? WHERE seq = ?", to, from)
	for _, table := range append([]string{"assessment"}, dependants...) {
		x.exec(db, "UPDATE "+table+" SET entry = ? WHERE entry = ?", to, from)
	}
}

func (x *tamperer) last(db *sql.DB) int64 {
	entries := x.entries(db)
	return entries[len(entries)-1].Seq
}

// replace writes the file anew.
func (x *tamperer) replace(content []byte) {
	x.t.Helper()
	if err := os.WriteFile(x.file, content, 0o600); err != nil {
		x.t.Fatal(err)
	}
}

// bytes writes bytes at a place of the file: a number, or @TEXT for the last
// place of a text (earlier ones may lie in parts of the file that are unused).
func (x *tamperer) bytes(place, digits string) {
	x.t.Helper()
	content, err := os.ReadFile(x.file)
	if err != nil {
		x.t.Fatal(err)
	}
	at := 0
	if text, ok := strings.CutPrefix(place, "@"); ok {
		if at = bytes.LastIndex(content, []byte(text)); at < 0 {
			x.t.Fatalf("the file does not hold %q", text)
		}
	} else {
		at = int(x.number(place))
	}
	b, err := hex.DecodeString(digits)
	if err != nil || at+len(b) > len(content) {
		x.t.Fatalf("bytes %s %s: %v", place, digits, err)
	}
	if bytes.Equal(content[at:at+len(b)], b) {
		x.t.Fatal("nothing is altered")
	}
	copy(content[at:], b)
	x.replace(content)
}

// git alters what the repository holds.
func (x *tamperer) git(args []string) {
	x.t.Helper()
	if len(args) < 2 {
		x.t.Fatal("git WHAT COMMIT [VALUE]")
	}
	name := args[1]
	c, ok := x.repo.commits[name]
	if !ok {
		x.t.Fatalf("there is no commit %s", name)
	}
	switch what := strings.Join(slices.Delete(slices.Clone(args), 1, 2), " "); {
	case what == "gone":
		delete(x.repo.commits, name)
	case what == "rules":
		x.repo.rules[name] = true
	case what == "shallow":
		c.parent = "shallow"
		x.repo.commits[name] = c
	case args[0] == "content" && len(args) == 3:
		x.repo.content[name] = args[2]
	case args[0] == "policy" && len(args) == 3:
		x.repo.policy[name] = args[2]
	case args[0] == "author" && len(args) == 3:
		c.authors = append(slices.Clone(c.authors), args[2])
		x.repo.commits[name] = c
	default:
		x.t.Fatalf("git %s is not known", what)
	}
}
