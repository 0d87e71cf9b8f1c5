package main

import (
	"errors"
	"regexp"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"speedtrail/history/revision"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// meant puts the names that a mistyped one can have meant in front of a hint.
func meant(name string, known []string, hint string) string {
	near := schema.Nearest(name, known)
	if len(near) == 0 {
		return hint
	}
	for i := range near {
		near[i] = source.Visible(near[i])
	}
	last := len(near) - 1
	words := near[last]
	if last > 0 {
		words = strings.Join(near[:last], ", ") + " or " + words
	}
	return strings.TrimSuffix("did you mean "+words+"? "+hint, " ")
}

// chosen refuses the value of an option that is none of a few words.
func chosen(option, value string, words ...string) error {
	if slices.Contains(words, value) {
		return nil
	}
	last := len(words) - 1
	return badCall(meant(value, words, option+" is "+strings.Join(words[:last], ", ")+" or "+words[last]), "unknown value %q for %s", value, option)
}

// some lists the first of many names.
func some(names []string) string {
	const most = 12
	names = slices.Sorted(slices.Values(names))
	rest := ""
	if n := len(names); n > most {
		names, rest = names[:most], ", ..."
	}
	for i := range names {
		names[i] = source.Visible(names[i])
	}
	return strings.Join(names, ", ") + rest
}

// resolve finds the commit of a revision; of an unknown one it says which branches
// and tags have nearly its name.
func resolve(repo *revision.Repo, rev string) (revision.Commit, error) {
	c, err := repo.Resolve(rev)
	var unknown *revision.Error
	if !errors.Is(err, revision.ErrUnknown) || !errors.As(err, &unknown) {
		return c, err
	}
	name, names := rev, repo.Names()
	if i := strings.IndexAny(rev, "~^@"); i > 0 {
		name = rev[:i]
	}
	if slices.Contains(names, name) { // it is what follows that is wrong
		return c, err
	}
	nearer := *unknown
	nearer.Hint = meant(name, names, unknown.Hint)
	return c, &nearer
}

// optionName finds the options in the list that help prints.
var optionName = regexp.MustCompile(`(?m)^ +(?:-\w, )?(--[a-z-]+)`)

// flagHint says what to do about an option that a command does not have.
func flagHint(c *cobra.Command, err error) string {
	hint := c.CommandPath() + " --help lists the options"
	name, ok := strings.CutPrefix(err.Error(), "unknown flag: ")
	if !ok {
		return hint
	}
	var known []string
	for _, found := range optionName.FindAllStringSubmatch(c.Flags().FlagUsages(), -1) {
		known = append(known, found[1])
	}
	return meant(name, known, hint)
}

// joined writes names in a row.
func joined(names []string) string { return strings.Join(names, ", ") }
