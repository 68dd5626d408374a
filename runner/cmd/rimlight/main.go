// Rimlight turns raw spectroscopic light curves of a transit into the planet's
// transmission spectrum, by running Markdown recipes with embedded Go steps.
package main

import "rimlight/runner/command"

func main() { command.Main() }
