// Command man writes the manual pages of benchslip from what its commands say
// of themselves: go run ./cmd/benchslip/internal/man DIR. It builds the
// program, asks each command for its help, and sets that as a page, so there
// is no second text to keep. It is no part of the program.
package main

import (
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
)

func main() {
	if len(os.Args) != 2 || strings.HasPrefix(os.Args[1], "-") {
		fmt.Fprintln(os.Stderr, "man: wants one folder to write the pages into")
		os.Exit(2)
	}
	n, err := write(os.Args[1])
	if err != nil {
		fmt.Fprintf(os.Stderr, "man: %v\n", err)
		os.Exit(2)
	}
	fmt.Printf("%d pages in %s\n", n, os.Args[1])
}

// write builds the program in a folder of its own and writes a page for it and
// for every command below it.
func write(dir string) (pages int, err error) {
	tmp, err := os.MkdirTemp("", "man")
	if err != nil {
		return 0, err
	}
	defer os.RemoveAll(tmp)
	program := filepath.Join(tmp, "benchslip.exe") // the ending matters on one system only
	if out, err := exec.Command("go", "build", "-o", program, "benchslip/cmd/benchslip").CombinedOutput(); err != nil {
		return 0, fmt.Errorf("the program does not build: %w: %s", err, out)
	}
	ask := func(args ...string) (string, error) {
		out, err := exec.Command(program, args...).Output()
		if err != nil {
			return "", fmt.Errorf("benchslip %s: %w", strings.Join(args, " "), err)
		}
		return string(out), nil
	}
	version, err := ask("version")
	if err != nil {
		return 0, err
	}
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return 0, err
	}
	var each func(command []string, short string) error
	each = func(command []string, short string) error {
		text, err := ask(append([]string{"help"}, command...)...)
		if err != nil {
			return err
		}
		h := parse(text)
		if h.usage == "" {
			return errors.New("help without a first line: " + strings.Join(command, " "))
		}
		name := strings.Join(append([]string{"benchslip"}, command...), "-")
		if err := os.WriteFile(filepath.Join(dir, name+".1"), []byte(page(name, short, strings.TrimSpace(version), h)), 0o666); err != nil {
			return err
		}
		pages++
		for i, sub := range h.commands {
			if err := each(append(command[:len(command):len(command)], sub), h.shorts[i]); err != nil {
				return err
			}
		}
		return nil
	}
	return pages, each(nil, "numbers with their uncertainty, judged, from bench recordings")
}
