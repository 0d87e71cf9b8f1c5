package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// The commands that the README gives to its three readers work in the folder of
// the demonstration, as it says.
func TestReadmeCommands(t *testing.T) {
	text, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	_, rest, ok := strings.Cut(string(text), "\n## For whom\n")
	section, _, _ := strings.Cut(rest, "\n## ")
	if !ok {
		t.Fatal("the README has no section For whom")
	}
	dir := filepath.Join(t.TempDir(), "demo")
	var out, remarks bytes.Buffer
	if status := run(t.Context(), []string{"demo", dir}, nil, &out, &remarks); status != statusDone {
		t.Fatalf("status %d: %s", status, &remarks)
	}
	// The report that it prints begins as the README shows it.
	_, shown, _ := strings.Cut(string(text), "\n    VERDICT\n")
	shown, _, ok = strings.Cut(shown, "\n\nThe commit")
	if shown = strings.ReplaceAll("VERDICT\n"+shown, "\n    ", "\n"); !ok || !strings.Contains(out.String(), shown) {
		t.Errorf("the demonstration does not print what the README shows:\n%s", shown)
	}
	t.Chdir(dir)
	commands := 0
	for _, line := range strings.Split(section, "\n") {
		command, ok := strings.CutPrefix(line, "    speedtrail ")
		if !ok {
			continue
		}
		commands++
		var out, remarks bytes.Buffer
		status := run(t.Context(), words(command), nil, &out, &remarks)
		if status != statusDone && status != statusFinding {
			t.Errorf("speedtrail %s: status %d\n%s", command, status, &remarks)
		}
		if out.Len()+remarks.Len() == 0 {
			t.Errorf("speedtrail %s says nothing", command)
		}
	}
	if commands < 12 {
		t.Errorf("only %d commands were found", commands)
	}
}

// words splits a command as a shell does, with double quotes and nothing else.
func words(command string) []string {
	var list []string
	for i, part := range strings.Split(command, `"`) {
		if i%2 == 1 {
			list = append(list, part)
			continue
		}
		list = append(list, strings.Fields(part)...)
	}
	return list
}

// The files that the README shows are taken without a fault, in the data set of
// the demonstration.
func TestReadmeFiles(t *testing.T) {
	text, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	dir := filepath.Join(t.TempDir(), "demo")
	var out, remarks bytes.Buffer
	if status := run(t.Context(), []string{"demo", dir}, nil, &out, &remarks); status != statusDone {
		t.Fatalf("status %d: %s", status, &remarks)
	}
	write := func(name, content string) {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(content), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	for name, first := range map[string]string{
		"requests/CR-2701.toml": `id = "CR-2701"`, "accepted.toml": "[[accepted]]",
		"dataset.toml": "format = 1\n    name =", "signoff.toml": "format = 1\n\n    [[person]]",
	} {
		_, rest, ok := strings.Cut(string(text), "\n\n    "+first)
		if !ok {
			t.Fatalf("the README shows no %s", name)
		}
		content := first
		for _, line := range strings.SplitAfter(rest, "\n") {
			if line != "\n" && content != first && !strings.HasPrefix(line, "    ") {
				break
			}
			content += line
		}
		write(name, strings.ReplaceAll(content, "\n    ", "\n"))
	}
	keys, err := os.ReadFile(filepath.Join(dir, "allowed_signers"))
	if err != nil {
		t.Fatal(err)
	}
	// A key for each of the people, as the roles need them.
	found := strings.Split(string(keys), "ssh-ed25519 ")
	signers := ""
	for i, name := range []string{"m.vane", "l.coster", "d.reyl"} {
		key, _, _ := strings.Cut(found[i+1], "\n")
		signers += name + "@example.org ssh-ed25519 " + key + "\n"
	}
	write("allowed_signers", signers)
	out.Reset()
	remarks.Reset()
	if status := run(t.Context(), []string{"--repo", dir, "validate"}, nil, &out, &remarks); status != statusDone || strings.Contains(remarks.String(), "CR-2701") || strings.Contains(remarks.String(), "accepted.toml") {
		t.Errorf("status %d\n%s%s", status, &out, &remarks)
	}
}
