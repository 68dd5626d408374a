// Rimlight turns raw spectroscopic light curves of a transit into the planet's
// transmission spectrum, by running Markdown recipes with embedded Go steps.
package main

import (
	"os"

	"rimlight/runner/command"
	"rimlight/runner/worker"
)

func main() {
	if worker.Requested() {
		os.Exit(worker.Main())
	}
	os.Exit(command.Run(os.Args[1:], os.Stdout, os.Stderr))
}
