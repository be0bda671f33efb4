// Command groundtally is the window.
package main

import (
	"os"

	"groundtally/app/desk"
)

func main() {
	os.Exit(desk.Main(os.Args[1:], os.Stdout, os.Stderr))
}
