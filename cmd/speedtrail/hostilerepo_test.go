package main

import (
	"fmt"
	"maps"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
)

// nasty is a text of visible characters that means something to a browser, a
// shell, a template, a printf, Markdown and, by its first character, to a
// spreadsheet. A data set may hold it.
func nasty(first string) string {
	return first + `zz<zz q="'>&lt;$(id)` + "`id`" + `;|&![i](x)_*{{1}}%s\u`
}

// unseen is what a data set may not hold, but Git may: control codes, those that
// begin an escape sequence, marks of direction and of no width.
const unseen = "\x1b[31m\x1b]0;x\x07\x08\r\t\x7f\u0085\u009b31m\u00ad\u200b\u200f\u202e\u2028\u2066\ufeff\U000e0041"

// pathOf is a nasty text as the name of a file.
func pathOf(first string) string { return strings.NewReplacer("/", "", `\`, "").Replace(nasty(first)) }

// hostileRoute is the folder of the route.
var hostileRoute = "routes/" + pathOf("=")

// hostileFiles is a data set whose every free text is nasty.
func hostileFiles(t testing.TB, keys string) map[string]string {
	signoff, signers := policyOf(t, keys)
	train := func(id, name string, cant, length int) string {
		return fmt.Sprintf("[[train]]\nid = %s\nname = %s\ncant_deficiency_mm = %d\naxle_load = \"D4\"\nlength_m = %d\nmax_speed_kmh = 140\nacceleration_ms2 = 0.5\nbraking_ms2 = 0.5\n\n",
			quoted(id), quoted(name), cant, length)
	}
	return map[string]string{
		"signoff.toml": signoff, "allowed_signers": signers,
		"dataset.toml": "format = 1\nname = " + quoted(nasty("@")) + "\n",
		"trains.toml":  train(nasty("="), nasty("="), 80, 300) + train(nasty("+"), nasty("+"), 150, 100) + train(nasty("-"), nasty("-"), 300, 10) + train(nasty("@"), nasty("@"), 80, 20),
		"accepted.toml": "[[accepted]]\nfinding = \"step-size\"\nroute = \"-R\"\nfrom_km = -0.5\nto_km = 9\nreason = " + quoted(nasty("-")) + "\n" +
			"[[accepted]]\nfinding = \"delay-one-sided\"\nroute = \"-R\"\nfrom_km = -0.5\nto_km = 9\nreason = " + quoted(nasty("=")) + "\n",
		hostileRoute + "/route.toml":    "id = \"-R\"\nname = " + quoted(nasty("+")) + "\nstart_km = -0.5\nend_km = 9\n[[jump]]\narriving_km = 5\nleaving_km = 4.5\n",
		hostileRoute + "/speed.csv":     "from_km,to_km,basic,cd300,note\n-0.5,1,100,," + cell(nasty("=")) + "\n1,2,60,," + cell(nasty("+")) + "\n2,4.7#1,120,140," + cell(nasty("-")) + "\n4.7#1,9,100,," + cell(nasty("@")) + "\n",
		hostileRoute + "/axle-load.csv": "from_km,to_km,D4,note\n3,3.2,60," + cell(nasty("=")) + "\n",
		hostileRoute + "/temporary.csv": "id,from_km,to_km,speed,reason\n" + cell(nasty("=")) + ",6,7,40," + cell(nasty("=")) + "\n" + cell(nasty("-")) + ",7,8,140," + cell(nasty("+")) + "\n",
		hostileRoute + "/curves.csv":    "from_km,to_km,radius_m,cant_mm,note\n1,1.8,400,100," + cell(nasty("@")) + "\n",
		hostileRoute + "/places.csv": "km,kind,name,to_km,strike_in_m,warning_s\n1.5,crossing," + cell(nasty("=")) + ",,500,30\n0.5,station," + cell(nasty("@")) + ",,,\n" +
			"3,bridge," + cell(nasty("-")) + ",3.2,,\n",
		"requests/" + pathOf("+") + ".toml": "id = " + quoted(nasty("+")) + "\ntitle = \"Old\"\nreason = \"Old\"\n",
	}
}

// hostileRepo writes a repository with three revisions: base, target and one
// whose data is faulty in hostile ways.
func hostileRepo(t testing.TB, keys string) (dir string) {
	t.Helper()
	if runtime.GOOS == "windows" {
		t.Skip("the file system cannot hold such names")
	}
	base := hostileFiles(t, keys)
	target := maps.Clone(base)
	target[hostileRoute+"/speed.csv"] = strings.NewReplacer("1,2,60", "1,2,80", "120,140", "130,").Replace(base[hostileRoute+"/speed.csv"])
	target[hostileRoute+"/axle-load.csv"] = strings.Replace(base[hostileRoute+"/axle-load.csv"], "3,3.2,60", "3,3.1,60", 1)
	target["requests/"+pathOf("=")+".toml"] = "id = " + quoted(nasty("=")) + "\ntitle = " + quoted(nasty("-")) + "\nreason = " + quoted(nasty("+")) +
		"\n[[declares]]\nroute = \"-R\"\nfrom_km = 1\nto_km = 2\neffect = \"raise\"\ntrains = [" + quoted(nasty("=")) + ", " + quoted(nasty("@")) + "]\n"
	faulty := maps.Clone(target)
	faulty["dataset.toml"] = "format = 1\nname = \"a\u202eb\"\n\"x\\u001b[31m\" = 1\n"
	faulty["routes/a"+unseen+"b/route.toml"] = "id = \"X\"\n"
	faulty[hostileRoute+"/x"+unseen+".csv"] = "a\n"
	faulty[hostileRoute+"/curves.csv"] = "from_km,to_km,radius_m,cant_mm,n\x1bte\nx" + unseen[:12] + ",1.8,=1,100,x\n"
	faulty["requests/r"+unseen+".toml"] = "id = \"\x1b\"\n"
	faulty["trains.toml"] += "[[train]]\nid = \"\u202e\"\ncategories = [\"<b>\u2066\"]\n"
	who := compose.Person{Name: "Ada " + unseen + `=zz&"'` + "`id`$(id)|[i](x)", Email: `"'><zz q="'>` + unseen + "@e.example"}
	subject := func(first string) string {
		// A line end and a zero byte end a subject, so they are left out.
		return nasty(first) + unseen + "\n\n" + nasty("+") + unseen + "\n"
	}
	when := time.Date(2026, 3, 2, 10, 0, 0, 0, time.UTC)
	dir = filepath.Join(t.TempDir(), "repo")
	err := compose.Write(t.Context(), dir, []compose.Commit{
		{Files: base, Author: who, When: when, Message: subject("="), Tag: hostileTag("="), TagText: subject("-")},
		{Parents: []int{0}, Files: faulty, Author: who, When: when.Add(time.Hour), Message: subject("@"), Tag: "faulty"},
		{Parents: []int{0}, Files: target, Author: who, When: when.Add(time.Hour), Message: subject("+"), Tag: hostileTag("+"), TagText: subject("-")}, // checked out
	})
	if err != nil {
		t.Fatal(err)
	}
	// Branches of the same kind, as files: base and target by such names.
	for first, tag := range map[string]string{"=": hostileTag("="), "+": hostileTag("+")} {
		hash := strings.TrimSpace(string(readFileOf(t, filepath.Join(dir, ".git", "refs", "tags", tag))))
		if err := os.WriteFile(filepath.Join(dir, ".git", "refs", "heads", hostileBranch(first)), []byte(hash+"\n"), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

// hostileTag is a name that git allows: no blank, control code of one byte, ~^:?*[\.
func hostileTag(first string) string {
	return first + `zz<zz,q="'>$(id)` + "`id`" + ";|&!(x)_{1}%s\u0085\u009b31m\u202e\u2066\u200b"
}

// hostileBranch is such a name of a branch.
func hostileBranch(first string) string { return "branch" + hostileTag(first) }
