package past

import (
	"context"
	"fmt"
	"maps"
	"os"
	"os/exec"
	"slices"
	"strings"
	"testing"

	"speedtrail/history/compose"
	"speedtrail/history/internal/network"
)

// Write writes a history into a new folder with the git program, in one pack. It
// skips the test where the program is absent; in CI that is a failure.
func Write(tb testing.TB, history []compose.Commit) (dir string) {
	tb.Helper()
	if _, err := exec.LookPath("git"); err != nil {
		if os.Getenv("CI") == "true" {
			tb.Fatal(err)
		}
		tb.Skip("the git program is not installed")
	}
	var s strings.Builder
	for i, c := range history {
		who := fmt.Sprintf("%s <%s> %d +0000", c.Author.Name, c.Author.Email, c.When.Unix())
		fmt.Fprintf(&s, "commit refs/heads/main\nmark :%d\nauthor %s\ncommitter %s\ndata %d\n%s\n", i+1, who, who, len(c.Message), c.Message)
		for k, p := range c.Parents {
			fmt.Fprintf(&s, "%s :%d\n", []string{"from", "merge"}[min(k, 1)], p+1)
		}
		s.WriteString("deleteall\n")
		for _, name := range slices.Sorted(maps.Keys(c.Files)) {
			fmt.Fprintf(&s, "M 100644 inline %s\ndata %d\n%s\n", name, len(c.Files[name]), c.Files[name])
		}
		s.WriteString("\n")
	}
	dir = tb.TempDir()
	ctx := context.Background()
	if err := network.Git(ctx, dir, nil, "init", "-q", "-b", "main"); err != nil {
		tb.Fatal(err)
	}
	if err := network.Git(ctx, dir, strings.NewReader(s.String()), "-c", "fastimport.unpackLimit=1", "fast-import", "--quiet", "--force"); err != nil {
		tb.Fatal(err)
	}
	return dir
}
