// Command gainwright is a calculator and notebook for state-space design of controllers:
// a prompt, a runner for design files, and the commands around them.
package main

import "os"

func main() {
	os.Exit(Run(os.Args[1:], os.Stdin, os.Stdout, os.Stderr))
}
