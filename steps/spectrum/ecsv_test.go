package spectrum

import (
	"bytes"
	"encoding/json"
	"math"
	"os"
	"os/exec"
	"strings"
	"testing"
)

func TestECSVGolden(t *testing.T) {
	got, err := ECSV(sample(t), []Note{{"title", `A "warm" planet: µm # 1`}, {"recipe", "continuous.md"}})
	if err != nil {
		t.Fatal(err)
	}
	golden(t, "spectrum.ecsv", got)
}

func TestECSVIndependent(t *testing.T) {
	s, err := Assemble(sample(t).Points, nil)
	if err != nil {
		t.Fatal(err)
	}
	got, err := ECSV(s, nil)
	if err != nil {
		t.Fatal(err)
	}
	if bytes.Contains(got, []byte("depth_cov")) {
		t.Error("independent channels were written with a covariance")
	}
}

func TestECSVRefuses(t *testing.T) {
	for _, notes := range [][]Note{{{"", "x"}}, {{"a", "x"}, {"a", "y"}}, {{"limb_law", "x"}}} {
		if _, err := ECSV(sample(t), notes); err == nil {
			t.Errorf("notes %q were accepted", notes)
		}
	}
}

// python is the interpreter that has astropy on Debian.
const python = "/usr/bin/python3"

// astropyScript reads a spectrum from standard input and prints what it found.
const astropyScript = `
import sys, json, warnings
import numpy as np
from astropy.io import ascii
warnings.simplefilter("error")
t = ascii.read(sys.stdin.read(), format="ecsv")
def plain(column):
    return [None if np.ma.is_masked(x) or x != x else x for x in np.ma.asarray(column).tolist()]
print(json.dumps({
    "names": t.colnames,
    "unit": str(t["wave_lo"].unit),
    "about": t["depth"].description,
    "meta": list(t.meta.items()),
    "depth": plain(t["depth"]),
    "used": plain(t["samples_used"]),
    "kind": str(t["samples_used"].dtype),
    "flag": plain(t["flag"]),
    "cov": np.ma.asarray(t["depth_cov"]).filled(np.nan).astype(str).tolist() if "depth_cov" in t.colnames else None,
}))
`

// TestECSVOpensInAstropy reads the file back with astropy. It is skipped where
// there is none, unless RIMLIGHT_REQUIRE asks for it.
func TestECSVOpensInAstropy(t *testing.T) {
	if err := exec.Command(python, "-c", "import astropy").Run(); err != nil {
		if os.Getenv("RIMLIGHT_REQUIRE") != "" {
			t.Fatalf("no astropy: %v", err)
		}
		t.Skipf("no astropy: %v", err)
	}
	s := sample(t)
	title := "A \"warm\" planet: µm # 1\n- 'x', \t{y} \u2028 \U0001F30D \\ \x7f\xff"
	in, err := ECSV(s, []Note{{"title", title}})
	if err != nil {
		t.Fatal(err)
	}
	cmd := exec.Command(python, "-c", astropyScript)
	cmd.Stdin = bytes.NewReader(in)
	var complaint strings.Builder
	cmd.Stderr = &complaint
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("astropy: %v\n%s\n%s", err, complaint.String(), in)
	}
	var got struct {
		Names       []string
		Unit, About string
		Meta        [][2]string
		Depth       []*float64
		Used        []int
		Kind        string
		Flag        []*string
		Cov         [][]string
	}
	if err := json.Unmarshal(out, &got); err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	if len(got.Names) != 17 || got.Names[0] != "wave_lo" || got.Unit != "um" || !strings.HasPrefix(got.About, "transit depth") || got.Kind != "int64" {
		t.Errorf("%+v", got)
	}
	wantMeta := [][2]string{{"limb_law", "quadratic"}, {"limb_policy", "free"}, {"title", strings.ToValidUTF8(title, "\ufffd")}}
	for k, m := range wantMeta {
		if k >= len(got.Meta) || got.Meta[k] != m {
			t.Errorf("metadata %q, want %q", got.Meta, wantMeta)
			break
		}
	}
	if got.Depth[0] == nil || *got.Depth[0] != s.Points[0].Depth || got.Depth[1] != nil || *got.Depth[2] != s.Points[2].Depth {
		t.Errorf("depths %v", got.Depth)
	}
	if got.Used[2] != 1000 || got.Flag[0] != nil || *got.Flag[1] != s.Points[1].Flag || *got.Flag[2] != "limb darkening at a bound" {
		t.Errorf("used %v, flags %v", got.Used, got.Flag)
	}
	if len(got.Cov) != 3 || got.Cov[0][2] != "2e-11" || got.Cov[1][1] != "nan" {
		t.Errorf("covariance %v, want %v", got.Cov, s.Cov)
	}
	if math.Abs(s.Cov[0][2]-2e-11) > 1e-26 {
		t.Error("the sample has changed")
	}
}
