package apitest

import (
	"net/http"
	"strings"
)

func (s *Server) getCommit(in *call) answer {
	sha, ok := s.commitID(in.params["ref"])
	if !ok {
		return notFound()
	}
	return answer{status: http.StatusOK, value: s.commitJSON(sha)}
}

// commitJSON is a commit as most operations show it.
func (s *Server) commitJSON(sha string) object {
	o := s.gitCommit(sha)
	return object{"sha": sha, "parents": o["parents"], "commit": object{"message": o["message"], "tree": o["tree"]}}
}

// gitCommit is a commit as the git database shows it.
func (s *Server) gitCommit(sha string) object {
	text, _ := s.line("log", "-1", "--format=%T%n%P%n%B", sha)
	tree, rest, _ := strings.Cut(text, "\n")
	ids, message, _ := strings.Cut(rest, "\n")
	parents := []object{}
	for _, id := range strings.Fields(ids) {
		parents = append(parents, object{"sha": id})
	}
	return object{"sha": sha, "message": message, "tree": object{"sha": tree}, "parents": parents}
}

func (s *Server) getGitCommit(in *call) answer {
	sha, ok := s.line("rev-parse", "--verify", "--quiet", "--end-of-options", in.params["commit_sha"]+"^{commit}")
	if !ok {
		return notFound()
	}
	return answer{status: http.StatusOK, value: s.gitCommit(sha)}
}

// compare answers for "main...topic", also with the owner of a fork before
// either: the host keeps forks and their parents in one store.
func (s *Server) compare(in *call) answer {
	left, right, ok := strings.Cut(in.params["basehead"], "...")
	a, okA := s.commitID(ownerless(left))
	b, okB := s.commitID(ownerless(right))
	merge, okM := s.line("merge-base", a, b)
	if !ok || !okA || !okB || !okM {
		return notFound()
	}
	ahead := s.between(merge, b)
	behind := s.between(merge, a)
	commits := []object{}
	for _, sha := range ahead {
		commits = append(commits, s.commitJSON(sha))
	}
	shown, link := page(s, in, commits)
	value := object{"base_commit": s.commitJSON(a), "merge_base_commit": s.commitJSON(merge), "status": relation(len(ahead), len(behind)),
		"ahead_by": len(ahead), "behind_by": len(behind), "total_commits": len(ahead), "commits": shown}
	if number := in.query.Get("page"); number == "" || number == "1" { // the host lists files on the first page alone
		value["files"] = s.changed(merge, b)
	}
	return answer{status: http.StatusOK, link: link, value: value}
}

func ownerless(name string) string {
	if _, ref, ok := strings.Cut(name, ":"); ok {
		return ref
	}
	return name
}

func relation(ahead, behind int) string {
	switch {
	case ahead > 0 && behind > 0:
		return "diverged"
	case ahead > 0:
		return "ahead"
	case behind > 0:
		return "behind"
	}
	return "identical"
}

// between lists the commits of b that are not in a, oldest first.
func (s *Server) between(a, b string) []string {
	out, _ := s.line("rev-list", "--reverse", a+".."+b)
	return strings.Fields(out)
}

// changed lists the files that differ.
func (s *Server) changed(a, b string) []object {
	out, _ := s.git("diff", "--raw", "--no-abbrev", "--no-renames", "-z", a, b)
	words := map[string]string{"A": "added", "D": "removed", "M": "modified", "T": "changed"}
	list := []object{}
	fields := strings.Split(strings.TrimSuffix(string(out), "\x00"), "\x00")
	for i := 0; i+1 < len(fields); i += 2 {
		about := strings.Fields(fields[i]) // :mode mode old new status
		sha := about[3]
		if about[4] == "D" {
			sha = about[2]
		}
		list = append(list, object{"filename": fields[i+1], "status": words[about[4]], "sha": sha})
	}
	return list
}
