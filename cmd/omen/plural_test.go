package main

import (
	"os"
	"path/filepath"
	"regexp"
	"testing"
)

// onePlural is one thing counted in the plural.
var onePlural = regexp.MustCompile(`(?:^|[^0-9.,−-])1 (?:[a-z]+ ){0,2}(?:rows|names|steps|degrees|measurements|values|inputs|supernovae|ratios|ages|rates|parameters|magnitudes|templates|universes|tables|evaluations|samples|warnings|arguments)\b`)

// No text that people read has "1 rows": a run in which most counts are one.
func TestOneIsSingular(t *testing.T) {
	dir := folder(t, map[string]string{
		"run.toml": "[universe]\ngeometry = \"flat\"\n[prior]\nOm = { flat = [0, 1] }\nH0 = { flat = [50, 90] }\n" +
			"[[data]]\nkind = \"ages\"\ntable = \"ages.csv\"\n[[data]]\nkind = \"rates\"\ntable = \"rates.csv\"\n" +
			"[[data]]\nkind = \"supernovae\"\ntable = \"sn.csv\"\noffset = \"absolute\"\ntemplates = \"sys.csv\"\n" +
			"[sampling]\neffective-samples = 200\nmax-steps = 20000\n",
		"ages.csv": "z,age,error\n0.5,8.6,0.3\n", "rates.csv": "z,H,error\n0.4,84,4\n",
		"sn.csv": "z,mu,mu_err\n0.3,40.96,0.1\n", "sys.csv": "dust\n0.05\n",
	})
	file, out := filepath.Join(dir, "run.toml"), filepath.Join(dir, "out")
	texts := map[string]string{"inspect": output(t, "inspect", file)}
	texts["fit"], texts["compare"] = output(t, "fit", file, "-o", out, "--quiet"), output(t, "compare", out, out)
	for _, name := range []string{"report.html", "methods.md"} {
		text, err := os.ReadFile(filepath.Join(out, name))
		if err != nil {
			t.Fatal(err)
		}
		texts[name] = string(text)
	}
	for name, text := range texts {
		for _, found := range onePlural.FindAllString(text, -1) {
			t.Errorf("%s: %q", name, found)
		}
	}
	if want := regexp.MustCompile(`\b1 degree of freedom\b`); !want.MatchString(texts["fit"]) || !want.MatchString(texts["report.html"]) {
		t.Errorf("no single degree of freedom in\n%s", texts["fit"])
	}
}
