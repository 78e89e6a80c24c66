// Command prune cuts the code host's published OpenAPI description down to the
// operations that budgetcheck uses: the whole is 13 MB and takes seconds to
// load. See ../README.md.
package main

import (
	"fmt"
	"os"
)

func main() {
	out, err := prune(os.Stdin, operations)
	if err == nil {
		_, err = os.Stdout.Write(out)
	}
	if err != nil {
		fmt.Fprintf(os.Stderr, "prune: %v\n", err)
		os.Exit(2)
	}
}

// operations are those that the client may call and the test server answers.
var operations = []operation{
	{"get", "/user"},
	{"get", "/repos/{owner}/{repo}/branches/{branch}"},
	{"get", "/repos/{owner}/{repo}/commits/{commit_sha}/pulls"},
	{"get", "/repos/{owner}/{repo}/commits/{ref}"},
	{"get", "/repos/{owner}/{repo}/commits/{ref}/check-runs"},
	{"get", "/repos/{owner}/{repo}/commits/{ref}/statuses"},
	{"get", "/repos/{owner}/{repo}/compare/{basehead}"},
	{"get", "/repos/{owner}/{repo}/contents/{path}"},
	{"get", "/repos/{owner}/{repo}/git/blobs/{file_sha}"},
	{"get", "/repos/{owner}/{repo}/git/commits/{commit_sha}"},
	{"get", "/repos/{owner}/{repo}/git/ref/{ref}"},
	{"get", "/repos/{owner}/{repo}/git/trees/{tree_sha}"},
	{"get", "/repos/{owner}/{repo}/issues/{issue_number}/comments"},
	{"get", "/repos/{owner}/{repo}/pulls"},
	{"get", "/repos/{owner}/{repo}/pulls/{pull_number}"},
	{"patch", "/repos/{owner}/{repo}/check-runs/{check_run_id}"},
	{"patch", "/repos/{owner}/{repo}/issues/comments/{comment_id}"},
	{"delete", "/repos/{owner}/{repo}/issues/comments/{comment_id}"},
	{"post", "/repos/{owner}/{repo}/check-runs"},
	{"post", "/repos/{owner}/{repo}/issues/{issue_number}/comments"},
	{"post", "/repos/{owner}/{repo}/statuses/{sha}"},
}
