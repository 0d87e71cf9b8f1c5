package main

import (
	"bytes"
	"path/filepath"
	"testing"

	"speedtrail/cmd/speedtrail/internal/published"
)

// Every JSON form of a command has its published schema, and what the commands
// write in the demonstration obeys it.
func TestSchemas(t *testing.T) {
	const root = "../.."
	absolute, err := filepath.Abs(root)
	if err != nil {
		t.Fatal(err)
	}
	dir := filepath.Join(t.TempDir(), "demo")
	var out, remarks bytes.Buffer
	if status := run(t.Context(), []string{"demo", dir}, nil, &out, &remarks); status != statusDone {
		t.Fatalf("status %d: %s", status, &remarks)
	}
	for _, test := range []struct {
		published.Form
		args []string
	}{
		{published.Form{File: "validation.schema.json", Format: "speedtrail-validation 1", Title: "A validation by speedtrail", Type: &validation{}}, []string{"validate", "HEAD", "--doubtful"}},
		{published.Form{File: "register.schema.json", Format: "speedtrail-register 1", Title: "The register of speedtrail", Type: &registerList{}}, []string{"register"}},
		{published.Form{File: "verification.schema.json", Format: "speedtrail-verification 1", Title: "A verification by speedtrail", Type: &verified{}}, []string{"verify"}},
		{published.Form{File: "inforce.schema.json", Format: "speedtrail-inforce 1", Title: "What went into service when", Type: &serviceLog{}}, []string{"inforce"}},
		{published.Form{File: "inforce-at.schema.json", Format: "speedtrail-inforce-at 1", Title: "What was in force at an instant", Type: &inForceAnswer{}}, []string{"inforce", "--when", "2025-09-01T12:00:00Z", "--route", "BW1", "--at", "34"}},
		{published.Form{File: "report.schema.json", Format: "speedtrail-report 1"}, []string{"report", "2"}},
		{published.Form{File: "trace.schema.json", Format: "speedtrail-trace 1", Type: nil}, []string{"trace", "--route", "BW1", "--at", "34", "--train", "IC"}},
		{published.Form{File: "trace.schema.json", Format: "speedtrail-trace 1", Type: nil}, []string{"trace", "--route", "BW1", "--from", "30", "--to", "40", "--train", "IC"}},
	} {
		if test.Type != nil {
			published.Check(t, test.Form, root, *update, "cmd/speedtrail", "history/assessment")
		}
		var out, remarks bytes.Buffer
		status := run(t.Context(), append([]string{"--repo", dir}, append(test.args, "--format", "json")...), nil, &out, &remarks)
		if status != statusDone && status != statusFinding {
			t.Fatalf("%v: status %d: %s", test.args, status, &remarks)
		}
		published.Obey(t, test.Form, absolute, out.Bytes())
	}
}
