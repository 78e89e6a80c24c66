package apitest

import (
	"encoding/json"
	"fmt"
	"net/http"
	"strings"
)

// repository is where all operations but one stand.
const repository = "/repos/{owner}/{repo}/"

// handlers answer the operations of the description.
var handlers = map[string]func(*Server, *call) answer{
	"GET issues/{issue_number}/comments":  (*Server).listComments,
	"POST issues/{issue_number}/comments": (*Server).createComment,
	"PATCH issues/comments/{comment_id}":  (*Server).editComment,
	"DELETE issues/comments/{comment_id}": (*Server).deleteComment,
	"GET commits/{ref}/check-runs":        (*Server).listChecks,
	"POST check-runs":                     (*Server).createCheck,
	"PATCH check-runs/{check_run_id}":     (*Server).updateCheck,
	"POST statuses/{sha}":                 (*Server).createStatus,
	"GET commits/{ref}/statuses":          (*Server).listStatuses,
	"GET pulls":                           (*Server).listPulls,
	"GET pulls/{pull_number}":             (*Server).getPull,
	"GET commits/{commit_sha}/pulls":      (*Server).pullsOfCommit,
	"GET git/trees/{tree_sha}":            (*Server).getTree,
	"GET git/blobs/{file_sha}":            (*Server).getBlob,
	"GET git/commits/{commit_sha}":        (*Server).getGitCommit,
	"GET commits/{ref}":                   (*Server).getCommit,
	"GET compare/{basehead}":              (*Server).compare,
	"GET branches/{branch}":               (*Server).getBranch,
	"GET git/ref/{ref:.+}":                (*Server).getRef,
	"GET contents/{path:.+}":              (*Server).getContents,
}

// handle carries out a request.
func (s *Server) handle(in *call, r *http.Request) answer {
	method, path, _ := strings.Cut(in.operation, " ")
	shown := r.Header.Get("Authorization")
	switch {
	case shown != "" && shown != "Bearer "+s.o.Token:
		return refuse(http.StatusUnauthorized, "Bad credentials")
	case shown == "" && (method != http.MethodGet || path == "/user"):
		return refuse(http.StatusUnauthorized, "Requires authentication")
	case path == "/user":
		return s.getUser()
	case in.params["owner"]+"/"+in.params["repo"] != s.o.Repository:
		return notFound()
	case s.o.Forge && strings.Contains(path, "check-runs"):
		return notFound()
	}
	return handlers[method+" "+strings.TrimPrefix(path, repository)](s, in)
}

func notFound() answer { return refuse(http.StatusNotFound, "Not Found") }

// forbidden is what the host says to a token that lacks a permission.
func forbidden() answer {
	return refuse(http.StatusForbidden, "Resource not accessible by integration")
}

// getUser answers only people: the token of an app is nobody's.
func (s *Server) getUser() answer {
	if s.o.As.Type == "Bot" {
		return forbidden()
	}
	me := s.o.As.json()
	me["user_view_type"] = "private" // who asks is who it is about
	return answer{status: http.StatusOK, value: me}
}

func (u User) json() object {
	kind := u.Type
	if kind == "" {
		kind = "User" // taken away again for hosts that do not tell
	}
	return object{"login": u.Login, "id": u.ID, "type": kind}
}

// lean takes away what other makes of host do not send.
func (a *answer) lean() {
	a.value = without(plainJSON(a.value), "node_id", "performed_via_github_app", "author_association", "type", "gravatar_id")
	a.body, _ = json.Marshal(a.value)
}

func without(v any, keys ...string) any {
	switch v := v.(type) {
	case object:
		for _, key := range keys {
			delete(v, key)
		}
		for key := range v {
			v[key] = without(v[key], keys...)
		}
	case []any:
		for i := range v {
			v[i] = without(v[i], keys...)
		}
	}
	return v
}

// plainJSON is a value as a reader of its JSON sees it.
func plainJSON(v any) (out any) {
	text, err := json.Marshal(v)
	if err == nil {
		err = json.Unmarshal(text, &out)
	}
	if err != nil {
		panic(err) // the server made it
	}
	return out
}

// page cuts a list and tells where it goes on.
func page[E any](s *Server, in *call, list []E) ([]E, string) {
	size, number := 30, 1
	fmt.Sscan(in.query.Get("per_page"), &size)
	fmt.Sscan(in.query.Get("page"), &number)
	if s.o.Forge { // comments come all at once there
		return list, ""
	}
	from, to := min((number-1)*size, len(list)), min(number*size, len(list))
	if to == len(list) {
		return list[from:to], ""
	}
	q := in.input.Request.URL.Query()
	q.Set("page", fmt.Sprint(number+1))
	return list[from:to], fmt.Sprintf("<%s%s?%s>; rel=\"next\"", s.URL, in.input.Request.URL.Path, q.Encode())
}
