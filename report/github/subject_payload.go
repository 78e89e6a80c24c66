package github

import (
	"encoding/json"
	"errors"
	"strings"
)

// The payloads hold hundreds of keys. These structs name those that are used
// and nothing else, so that a key which a host writes in another way, or which
// is new, cannot stop a gate that does not need it.

type repositoryKeys struct {
	ID            int64  `json:"id"`
	FullName      string `json:"full_name"`
	DefaultBranch string `json:"default_branch"`
}

// owner is the part of the name before the slash; empty if there is none.
func (r *repositoryKeys) owner() string {
	if r == nil {
		return ""
	}
	owner, _, _ := strings.Cut(r.FullName, "/")
	return owner
}

// is says whether both are one repository. Names may differ in case only; one
// that is gone is no repository.
func (r *repositoryKeys) is(other *repositoryKeys) bool {
	return r != nil && other != nil && r.FullName != "" && strings.EqualFold(r.FullName, other.FullName)
}

type sideKeys struct {
	Ref  string          `json:"ref"`
	SHA  string          `json:"sha"`
	Repo *repositoryKeys `json:"repo"` // nil if it is gone
}

type pullKeys struct {
	Number int      `json:"number"`
	Head   sideKeys `json:"head"`
	Base   sideKeys `json:"base"`
}

// homePayload is of all events.
type homePayload struct {
	Repository repositoryKeys `json:"repository"`
}

type pullPayload struct {
	Number int       `json:"number"`
	Pull   *pullKeys `json:"pull_request"`
}

// refPayload is of pushes, schedules and dispatches.
type refPayload struct {
	Ref        string `json:"ref"`
	BaseRef    string `json:"base_ref"`
	Before     string `json:"before"`
	After      string `json:"after"`
	Deleted    bool   `json:"deleted"`
	HeadCommit struct {
		ID string `json:"id"`
	} `json:"head_commit"`
}

type groupPayload struct {
	Group *struct {
		HeadSHA string `json:"head_sha"`
		HeadRef string `json:"head_ref"`
		BaseSHA string `json:"base_sha"`
		BaseRef string `json:"base_ref"`
	} `json:"merge_group"`
}

type runKeys struct {
	Event          string          `json:"event"`
	HeadBranch     string          `json:"head_branch"`
	HeadSHA        string          `json:"head_sha"`
	HeadRepository *repositoryKeys `json:"head_repository"` // nil if it is gone
	Pulls          []pullKeys      `json:"pull_requests"`   // of forks it is empty
}

type runPayload struct {
	homePayload
	Run *runKeys `json:"workflow_run"`
}

// decode reads the keys of one kind of event.
func decode[T any](payload []byte) (keys T, err error) {
	err = json.Unmarshal(payload, &keys)
	var kind *json.UnmarshalTypeError
	var c checker
	switch {
	case errors.As(err, &kind) && kind.Field == "":
		c.fail("the payload is a JSON %s, not an object", firstWord(kind.Value))
	case errors.As(err, &kind):
		c.fail("%s is a JSON %s, where %s is expected", kind.Field, firstWord(kind.Value), kind.Type.Kind())
	case err != nil:
		c.fail("the payload is not JSON (%v)", err)
	}
	return keys, c.err
}

// firstWord leaves out the number in "number 1e99", which may be any length.
func firstWord(text string) string {
	word, _, _ := strings.Cut(text, " ")
	return word
}
