package apitest

import (
	"net/http"
	"slices"
	"strings"
)

func (s *Server) getPull(in *call) answer {
	for _, p := range s.pulls {
		if p.Number == int(in.number("pull_number")) {
			return answer{status: http.StatusOK, value: s.pull(p, true)}
		}
	}
	return notFound()
}

// listPulls filters as the host does: head is "owner:branch".
func (s *Server) listPulls(in *call) answer {
	list := []object{}
	for _, p := range s.pulls {
		state := in.query.Get("state")
		owner, branch, _ := strings.Cut(in.query.Get("head"), ":")
		switch {
		case state != "all" && state != "closed" && p.state() != "open",
			state == "closed" && p.state() != "closed",
			branch != "" && (branch != p.Head.Ref || owner != s.owner(p)),
			in.query.Has("base") && in.query.Get("base") != p.Base.Ref:
			continue
		}
		list = append(list, s.pull(p, false))
	}
	return s.listed(in, list)
}

func (s *Server) listed(in *call, list []object) answer {
	shown, link := page(s, in, list)
	return answer{status: http.StatusOK, value: shown, link: link}
}

// pullsOfCommit lists the pull requests that a commit came with.
func (s *Server) pullsOfCommit(in *call) answer {
	list := []object{}
	for _, p := range s.pulls {
		if p.has(in.params["commit_sha"]) {
			list = append(list, s.pull(p, false))
		}
	}
	return s.listed(in, list)
}

func (p Pull) has(sha string) bool {
	if sha == p.Head.SHA || p.MergeCommit != "" && sha == p.MergeCommit {
		return true
	}
	return slices.Contains(p.Commits, sha)
}

func (p Pull) state() string {
	if p.State == "" {
		return "open"
	}
	return p.State
}

// headOf is the repository that the head is in.
func (s *Server) headOf(p Pull) string {
	if p.HeadOf == "" {
		return s.o.Repository
	}
	return p.HeadOf
}

func (s *Server) owner(p Pull) string {
	owner, _, _ := strings.Cut(s.headOf(p), "/")
	return owner
}

// pull is a pull request in whole or as it stands in lists.
func (s *Server) pull(p Pull, whole bool) object {
	o := object{"number": p.Number, "id": p.Number, "state": p.state(), "title": p.Title, "draft": p.Draft,
		"head": s.side(p.Head, s.headOf(p)), "base": s.side(p.Base, s.o.Repository)}
	if p.HeadGone {
		o["head"].(object)["repo"] = nil
	}
	if p.MergeCommit != "" {
		o["merge_commit_sha"] = p.MergeCommit
	}
	if p.Merged {
		o["merged_at"] = moment
	}
	if whole {
		o["merged"] = p.Merged
	}
	if p.OpenedBy != "" {
		o["user"] = Person(p.OpenedBy).json()
	}
	return o
}

func (s *Server) side(b Branch, of string) object {
	owner, name, _ := strings.Cut(of, "/")
	return object{"ref": b.Ref, "sha": b.SHA, "label": owner + ":" + b.Ref,
		"repo": object{"full_name": of, "name": name, "id": idOf(of), "fork": of != s.o.Repository, "owner": Person(owner).json()}}
}
