package main

import (
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"speedtrail/schema/source"
)

// spareLedger refuses a call that would write a result over the ledger, the index,
// or what SQLite keeps beside them: before anything is recorded or signed. The
// ledger of the repository counts even where another one is named.
func (a *app) spareLedger(c *cobra.Command) error {
	var kept []string
	for _, option := range []struct {
		name    string
		endings []string
	}{{"out", []string{""}}, {"write", []string{"", ".sig"}}} {
		f := c.Flags().Lookup(option.name)
		if f == nil || f.Value.String() == "" {
			continue
		}
		if kept == nil {
			kept = a.keptFiles()
		}
		for _, ending := range option.endings {
			name := f.Value.String() + ending
			for _, file := range kept {
				if samePlace(name, file) {
					return badCall("name another file with --"+option.name, "--%s would write %s over the ledger or what belongs to it, %s", option.name, source.Quote(name), source.Quote(file))
				}
			}
		}
	}
	return nil
}

// keptFiles lists the files that no result is written over, there or not.
func (a *app) keptFiles() (list []string) {
	ledgers := []string{a.ledger}
	if repo, err := a.openRepo(); err == nil {
		defer repo.Close()
		ledgers = append(ledgers, filepath.Join(repo.CommonDir(), "speedtrail", "ledger.db"))
	}
	for _, file := range ledgers {
		if file == "" {
			continue
		}
		for _, base := range []string{file, filepath.Join(filepath.Dir(file), "index.db")} {
			for _, ending := range sqliteFiles {
				list = append(list, base+ending)
			}
		}
	}
	return list
}

// samePlace tells whether two names lead to one file, which need not be there yet.
// Names that differ in case only may be one, so they are.
func samePlace(a, b string) bool {
	here, restA := standingPart(a)
	there, restB := standingPart(b)
	return here != nil && there != nil && os.SameFile(here, there) && strings.EqualFold(restA, restB)
}

// standingPart gives the last thing on the way to a file that is there, and the
// rest of the way.
func standingPart(file string) (os.FileInfo, string) {
	if info, err := os.Stat(file); err == nil {
		return info, ""
	}
	whole, err := filepath.Abs(file)
	if err != nil {
		return nil, ""
	}
	for dir := filepath.Dir(whole); ; dir = filepath.Dir(dir) {
		if info, err := os.Stat(dir); err == nil {
			return info, strings.TrimPrefix(whole, dir)
		}
		if dir == filepath.Dir(dir) {
			return nil, ""
		}
	}
}
