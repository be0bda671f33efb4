// Command dev runs what a contributor does by command: set-up, start, tests, checks.
//
// It needs the standard library alone (beside the parser of the project's cited tables), so
// that it works on a machine where nothing but Go is installed yet:
//
//	go run ./cmd/dev start    installs what is missing, builds, opens the sample study
//	go run ./cmd/dev test     installs what is missing, then runs vet, formatting, all tests
//	go run ./cmd/dev help     lists all commands
//
// It uses no network of its own: system libraries come through the package manager of the
// system, modules through the go command.
//
// Left out: Windows (no package manager is driven there), and a look at whether the package
// names for Fedora, Arch, openSUSE and Homebrew are right on those systems; help and doctor
// mark them "not tried".
package main
