// Package reports turns the record of a run into one self-contained HTML file.
//
// It reads nothing and computes nothing: a [Document] in, bytes out.
package reports

import (
	"time"

	"rimlight/steps/check"
)

// A Document is everything that a report shows. It is filled from a run's
// record and the result store; rendering needs nothing else.
type Document struct {
	Title    string
	Source   []byte // the recipe's Markdown, byte for byte
	File     string // the recipe's file name, without folders
	Outcome  Outcome
	Started  time.Time
	Ended    time.Time
	Inputs   []Input
	Settings []Setting
	Steps    []Step // in the order in which they stand in the recipe
	Host     Host
	Command  string    // the command line, for the record
	Modules  []Module  // what the program was built from
	Library  []Package // fingerprints of the step packages that were reached
	Notes    []string  // what else the run had to say: results that were damaged and computed again
	Record   []byte    // the run's record as JSON, embedded for programs; may be empty
}

// Outcome says how a run ended.
type Outcome string

// How a run can end.
const (
	Done        Outcome = "done"
	StepFailed  Outcome = "step failed"
	CheckFailed Outcome = "check failed"
	Interrupted Outcome = "interrupted"
)

// An Input is a raw input file as it was used.
type Input struct {
	Name    string
	Layout  string
	About   string
	Files   []InputFile // empty for an optional input that was absent
	Changed bool        // given on the command line instead of the recipe's own file
	Recipe  string      // the recipe's own file, as written
	Type    string      // Go type of what was read
	Value   any         // what was read, nil when not available
	Hash    string      // content hash of what was read, hex
	Key     string
	State   State
	Why     string
	Took    time.Duration
}

// An InputFile is one file of an input.
type InputFile struct {
	Name   string // file name without folders
	Size   int64
	SHA256 string // hex, the one that sha256sum prints
}

// A Setting is a setting's value as it was used.
type Setting struct {
	Name    string
	Value   string
	Unit    string
	About   string
	AlsoTry []string
	Changed bool   // given on the command line instead of the recipe's own value
	Recipe  string // the recipe's own value
	Line    int
}

// State says where a step's results came from.
type State string

// States of a step, and of a fan-out element.
const (
	Computed   State = "computed"    // in this run
	Reused     State = "reused"      // from the store
	Failed     State = "failed"      // its code returned an error or was stopped
	NotReached State = "not reached" // something before it failed, or the run was interrupted
)

// A Step is one step of the recipe with its results.
type Step struct {
	Name      string
	Fence     int    // index among the fenced blocks of the recipe's Markdown, from 0
	Section   string // heading it stands under
	Line      int    // line of the function in the recipe
	Signature string // its Go signature
	Doc       string // its doc comment, without comment marks
	Each      string // the fan-out directive ("channel in channels"), empty for a plain step
	Args      []Argument
	Results   []Result
	State     State
	Why       string        // why it ran: "first time", "setting clipSigma changed"; empty when reused
	Err       string        // why it failed
	Log       string        // what it said while computing
	Key       string        // hex; empty for a fan-out, whose elements have their own
	Seed      uint64        // random seed wired into it; 0 when it takes none
	Took      time.Duration // computing time, when it was computed (also shown when reused)
	When      time.Time     // when it was computed
	Host      string        // where, when that was not the machine of the run
	Elements  []Element     // of a fan-out
	Checks    []check.Check // the runner's own verdicts on it
}

// An Element is one element of a fan-out.
type Element struct {
	Label string // what it is, for example "2.31 to 2.37 um", or its number
	State State
	Why   string
	Err   string
	Key   string
	Hash  string // of its first result
	Took  time.Duration
}

// An Argument is a step's parameter and where its value came from.
type Argument struct {
	Name   string
	Type   string
	Source string // "input", "setting", "result", "priors", "element", "seed"
	From   string // name of the step, or of the section for priors
	Text   string // the value, when it is short: a setting's value and unit; empty otherwise
	Hash   string // content hash, hex
	Value  any    // decoded fit.Priors for priors; nil otherwise
}

// A Result is a named result of a step.
type Result struct {
	Name  string
	Type  string // Go type
	Hash  string // content hash, hex
	Size  int64  // bytes in the store
	Value any    // decoded value; nil when it is not shown
}

// Host is what the run ran on.
type Host struct {
	OS          string
	Arch        string
	CPUs        int
	GoVersion   string
	Version     string   // of rimlight
	Revision    string   // version control revision, when known
	Executable  string   // SHA-256 of the program, hex
	Settings    []string // build settings that can change numbers, "GOAMD64=v1"
	Confinement []string // layers of confinement that were active
}

// A Module is a module that the program was built from.
type Module struct {
	Path    string
	Version string
	Sum     string
}

// A Package is a step-library package and the hash of its sources.
type Package struct {
	Path string
	Hash string
}
