package apitest

import (
	"fmt"
	"net/http"
	"slices"
)

func (s *Server) listChecks(in *call) answer {
	found := []object{}
	seen := map[string]bool{}
	for _, c := range slices.Backward(s.checks) { // newest first, as the host lists them
		if c.HeadSHA != in.params["ref"] || in.query.Has("check_name") && c.Name != in.query.Get("check_name") {
			continue
		}
		if suite := c.App + "\x00" + c.Name; in.query.Get("filter") == "all" || !seen[suite] {
			seen[suite] = true
			found = append(found, s.check(c))
		}
	}
	shown, link := page(s, in, found)
	return answer{status: http.StatusOK, value: object{"total_count": len(found), "check_runs": shown}, link: link}
}

func (s *Server) check(c CheckRun) object {
	o := object{"id": c.ID, "name": c.Name, "head_sha": c.HeadSHA, "external_id": c.External, "status": c.Status, "details_url": c.Details,
		"output": object{"title": c.Title, "summary": c.Summary, "annotations_count": len(c.Annotations)},
		"app":    object{"slug": c.App, "name": c.App, "id": idOf(c.App)}}
	if c.Conclusion != "" {
		o["conclusion"] = c.Conclusion
	}
	return o
}

// createCheck is for apps alone: the host gives checks to no person's token.
func (s *Server) createCheck(in *call) answer {
	app, ok := s.app()
	if !ok {
		return refuse(http.StatusForbidden, "You must authenticate via a GitHub App.")
	}
	c := CheckRun{Name: in.text("name"), HeadSHA: in.text("head_sha"), Status: "queued", App: app}
	s.change(&c, in)
	c.ID = s.next()
	s.checks = append(s.checks, c)
	return answer{status: http.StatusCreated, value: s.check(c)}
}

// app is the app whose token the client has.
func (s *Server) app() (string, bool) {
	if s.o.As.Type != "Bot" {
		return "", false
	}
	return s.o.As.Login[:len(s.o.As.Login)-len("[bot]")], true
}

func (s *Server) updateCheck(in *call) answer {
	i := slices.IndexFunc(s.checks, func(c CheckRun) bool { return c.ID == in.number("check_run_id") })
	if i < 0 {
		return notFound()
	}
	if app, _ := s.app(); app != s.checks[i].App {
		return refuse(http.StatusForbidden, "Invalid app_id - check run can only be modified by the app that created it.")
	}
	s.change(&s.checks[i], in)
	return answer{status: http.StatusOK, value: s.check(s.checks[i])}
}

// change takes over what a request sets. Its limits are in the description.
func (s *Server) change(c *CheckRun, in *call) {
	set(&c.Name, in.body, "name")
	set(&c.Status, in.body, "status")
	set(&c.Conclusion, in.body, "conclusion")
	set(&c.External, in.body, "external_id")
	set(&c.Details, in.body, "details_url")
	if c.Status == "completed" && c.Conclusion == "" {
		s.t.Errorf("breach of the host's rules: check %q is completed without a conclusion", c.Name)
	}
	if c.Status != "completed" {
		c.Conclusion = ""
	}
	if out, ok := in.body["output"].(object); ok {
		c.output(out)
	}
}

func set(to *string, from object, key string) {
	if text, ok := from[key].(string); ok {
		*to = text
	}
}

// output is replaced, but annotations add up.
func (c *CheckRun) output(out object) {
	set(&c.Title, out, "title")
	set(&c.Summary, out, "summary")
	list, _ := out["annotations"].([]any)
	for _, v := range list {
		c.Annotations = append(c.Annotations, annotation(v.(object)))
	}
}

func annotation(o object) (a Annotation) {
	set(&a.Path, o, "path")
	set(&a.Level, o, "annotation_level")
	set(&a.Title, o, "title")
	set(&a.Message, o, "message")
	fmt.Sscan(fmt.Sprint(o["start_line"]), &a.Line)
	return a
}

func (s *Server) createStatus(in *call) answer {
	st := Status{in.params["sha"], in.text("state"), in.text("context"), in.text("description"), in.text("target_url")}
	if !s.within("the description of a status", st.Description, mostDescription) {
		return tooLong("description")
	}
	s.statuses = append(s.statuses, st)
	return answer{status: http.StatusCreated, value: st.json()}
}

func (s *Server) listStatuses(in *call) answer {
	list := []object{}
	for _, st := range slices.Backward(s.statuses) {
		if st.SHA == in.params["ref"] {
			list = append(list, st.json())
		}
	}
	shown, link := page(s, in, list)
	return answer{status: http.StatusOK, value: shown, link: link}
}

func (st Status) json() object {
	return object{"state": st.State, "context": st.Context, "description": st.Description, "target_url": st.Target}
}
