package main

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"github.com/santhosh-tekuri/jsonschema/v6"
	"github.com/stretchr/testify/require"
)

// testCommand runs the tests, this one too. It is not run from here.
const testCommand = ".github/test.sh"

// block is a fenced block of the README.
type block struct {
	line     int // of its fence
	language string
	text     string
	after    bool // directly after the block before it
}

var fenced = regexp.MustCompile("(?m)^```([a-z]+)\n((?s:.*?\n))```$")

// blocks cuts a page's fenced blocks out.
func blocks(page string) (list []block) {
	end := 0
	for _, m := range fenced.FindAllStringSubmatchIndex(page, -1) {
		after := len(list) > 0 && strings.TrimSpace(page[end:m[0]]) == ""
		list = append(list, block{1 + strings.Count(page[:m[0]], "\n"), page[m[2]:m[3]], page[m[4]:m[5]], after})
		end = m[1]
	}
	return list
}

var exitLine = regexp.MustCompile(`(?m)^# exit status (\d)\n\z`)

// status is the exit status that the block says it has.
func (b block) status(t *testing.T) int {
	t.Helper()
	m := exitLine.FindStringSubmatch(b.text)
	if m == nil {
		return 0
	}
	n, err := strconv.Atoi(m[1])
	require.NoError(t, err)
	return n
}

// TestREADME does what the README says, in its order, in a fresh copy. A block
// of text is what the commands directly before it print, or else all that some
// commands before it print.
func TestREADME(t *testing.T) {
	page, err := os.ReadFile("../../README.md")
	require.NoError(t, err)
	tree := freshCopy(t)
	ran := map[string]int{}
	var printed []string
	for _, b := range blocks(string(page)) {
		switch b.language {
		case "sh":
			printed = append(printed, b.run(t, tree))
		case "text":
			require.NotEmpty(t, printed, "README.md:%d: text before any command", b.line)
			if b.after {
				require.Equal(t, printed[len(printed)-1], b.text, "README.md:%d is not what is printed", b.line)
			}
			require.Contains(t, printed, b.text, "README.md:%d is printed by no command before it", b.line)
		case "python":
			b.writeRecord(t)
		}
		ran[b.language]++
	}
	require.NotZero(t, ran["sh"], "no command found")
	require.NotZero(t, ran["python"], "no snippet found")
}

// run runs a block of commands and gives what it prints.
func (b block) run(t *testing.T, tree string) string {
	t.Helper()
	if strings.TrimSpace(b.text) == testCommand {
		info, err := os.Stat(filepath.Join(tree, testCommand))
		require.NoError(t, err)
		require.NotZero(t, info.Mode()&0o111, "%s cannot be run", testCommand)
		return ""
	}
	var out, errs bytes.Buffer
	shell := exec.Command("bash", "-euo", "pipefail", "-c", b.text)
	shell.Dir, shell.Stdout, shell.Stderr = tree, &out, &errs
	shell.Env = append(os.Environ(), "GOBIN="+filepath.Join(tree, "bin"), "PATH="+filepath.Join(tree, "bin")+":"+os.Getenv("PATH"))
	err := shell.Run()
	require.NotNil(t, shell.ProcessState, "%v", err)
	require.Equal(t, b.status(t), shell.ProcessState.ExitCode(), "README.md:%d: %s\n%s%s", b.line, b.text, out.String(), errs.String())
	return out.String()
}

// writeRecord runs the snippet. What it leaves must be a record with nothing
// wrong in it, that the program weighs.
func (b block) writeRecord(t *testing.T) {
	t.Helper()
	dir := t.TempDir()
	python := exec.Command("python3", "-c", b.text)
	python.Dir = dir
	out, err := python.CombinedOutput()
	require.NoError(t, err, "README.md:%d: %s", b.line, out)
	written, err := filepath.Glob(filepath.Join(dir, "*.ndjson"))
	require.NoError(t, err)
	require.Len(t, written, 1, "README.md:%d", b.line)
	requireLines(t, written[0])
	var said, errs bytes.Buffer
	s := streams{out: &said, err: &errs}
	require.Equal(t, exitDone, run([]string{"vet", written[0]}, s), said.String())
	run([]string{"weigh", written[0]}, s) // without a series there is no total
	require.Contains(t, said.String(), "at the meters")
	require.Empty(t, errs.String())
}

func requireLines(t *testing.T, path string) {
	t.Helper()
	schema, err := jsonschema.NewCompiler().Compile(filepath.Join(start, "../../budget/record/schema.json"))
	require.NoError(t, err)
	text, err := os.ReadFile(path)
	require.NoError(t, err)
	for line := range strings.Lines(string(text)) {
		v, err := jsonschema.UnmarshalJSON(strings.NewReader(line))
		require.NoError(t, err, line)
		require.NoError(t, schema.Validate(v), line)
	}
}

// freshCopy is the tree as a clone of it would be once everything is committed.
func freshCopy(t *testing.T) string {
	t.Helper()
	list := exec.Command("git", "ls-files", "-coz", "--exclude-standard")
	list.Dir = "../.."
	out, err := list.Output()
	require.NoError(t, err, "the files are listed by git; this must be a clone")
	tree := t.TempDir()
	for _, name := range strings.Split(strings.TrimSuffix(string(out), "\x00"), "\x00") {
		info, err := os.Stat(filepath.Join("../..", name))
		if os.IsNotExist(err) {
			continue // deleted and not yet committed
		}
		require.NoError(t, err)
		data, err := os.ReadFile(filepath.Join("../..", name))
		require.NoError(t, err)
		require.NoError(t, os.MkdirAll(filepath.Dir(filepath.Join(tree, name)), 0o777))
		require.NoError(t, os.WriteFile(filepath.Join(tree, name), data, info.Mode().Perm()))
	}
	return tree
}

func TestBlocks(t *testing.T) {
	page := "# Tide\n```sh\ngate\n# exit status 1\n```\n\n```text\nclosed\n```\ntext\n```text\nalone\n```\n```python\npass\n```\n"
	list := blocks(page)
	require.Len(t, list, 4)
	require.Equal(t, []string{"sh", "text", "text", "python"}, []string{list[0].language, list[1].language, list[2].language, list[3].language})
	require.Equal(t, 2, list[0].line)
	require.Equal(t, "closed\n", list[1].text)
	require.Equal(t, []bool{false, true, false, true}, []bool{list[0].after, list[1].after, list[2].after, list[3].after})
	require.Equal(t, 1, list[0].status(t))
	require.Equal(t, 0, list[3].status(t))
	require.Equal(t, 0, block{text: "# exit status 1\ntrue\n"}.status(t), "only at the end")
}
