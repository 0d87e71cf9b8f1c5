package revision

import (
	"os"
	"path/filepath"
)

func homeDir() string {
	home, err := os.UserHomeDir()
	if err != nil {
		return ""
	}
	return home
}

// xdgDir is where git's own files of a user are looked for.
func xdgDir(home string) string {
	if dir := os.Getenv("XDG_CONFIG_HOME"); dir != "" {
		return filepath.Join(dir, "git")
	}
	if home == "" {
		return ""
	}
	return filepath.Join(home, ".config", "git")
}
