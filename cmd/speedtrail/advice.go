package main

import (
	"regexp"
	"runtime"
	"strings"
)

// commandWords finds the calls in an advice.
var commandWords = regexp.MustCompile(`\bspeedtrail (anchor|assess|export|import|inforce|profile|register|report|revoke|sign|trace|validate|verify)\b`)

// advise repeats the options of this call in the calls that an advice of this program
// names: without them they are about another repository or ledger. What an advice says
// itself stays.
func (a *app) advise(text string) string {
	var options []string
	for _, o := range []struct{ name, value, otherwise string }{{"repo", a.repo, "."}, {"data", a.data, "."}, {"ledger", a.ledger, ""}} {
		if o.value != o.otherwise && !strings.Contains(text, "--"+o.name+"=") {
			options = append(options, "--"+o.name+" "+quotedFor(runtime.GOOS, o.value))
		}
	}
	if options == nil {
		return text
	}
	return commandWords.ReplaceAllStringFunc(text, func(s string) string {
		return strings.Replace(s, " ", " "+strings.Join(options, " ")+" ", 1)
	})
}

// shellWord quotes a word for the shell of this system where it needs that.
func shellWord(s string) string { return quotedFor(runtime.GOOS, s) }

func quotedFor(system, s string) string {
	plain := "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_./:@+,="
	if system == "windows" {
		plain += `\`
	}
	switch {
	case s != "" && strings.Trim(s, plain) == "":
		return s
	case system == "windows":
		return `"` + s + `"` // a name cannot hold a quotation mark there
	}
	return "'" + strings.ReplaceAll(s, "'", `'\''`) + "'"
}
