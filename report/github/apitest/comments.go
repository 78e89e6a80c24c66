package apitest

import (
	"net/http"
	"slices"
	"unicode/utf8"
)

// The limits that the description does not have. Both count code points.
const (
	mostComment     = 65536
	mostDescription = 140 // of a commit status
)

// within tells whether a text fits; it is a breach if not.
func (s *Server) within(what, text string, most int) bool {
	n := utf8.RuneCountInString(text)
	if n > most {
		s.t.Errorf("breach of the host's limits: %s has %d characters, more than %d", what, n, most)
	}
	return n <= most
}

func tooLong(what string) answer {
	return refuse(http.StatusUnprocessableEntity, what+" is too long")
}

func (s *Server) listComments(in *call) answer {
	shown, link := page(s, in, s.of(int(in.number("issue_number"))))
	list := make([]object, len(shown))
	for i, c := range shown {
		list[i] = s.comment(c)
	}
	return answer{status: http.StatusOK, value: list, link: link}
}

func (s *Server) comment(c Comment) object {
	return object{"id": c.ID, "body": c.Body, "user": c.Author.json(), "performed_via_github_app": nil}
}

func (s *Server) createComment(in *call) answer {
	body := in.text("body")
	if !s.within("a comment", body, mostComment) {
		return tooLong("Body")
	}
	c := Comment{s.next(), int(in.number("issue_number")), s.o.As, body}
	s.comments = append(s.comments, c)
	return answer{status: http.StatusCreated, value: s.comment(c)}
}

// find is the place of the comment that a request is about.
func (s *Server) find(in *call) int {
	return slices.IndexFunc(s.comments, func(c Comment) bool { return c.ID == in.number("comment_id") })
}

// mine tells whether the token may change a comment. On most hosts a token
// that may write comments may change everybody's.
func (s *Server) mine(i int) bool { return !s.o.OwnOnly || s.comments[i].Author.ID == s.o.As.ID }

func (s *Server) editComment(in *call) answer {
	i := s.find(in)
	body := in.text("body")
	switch {
	case i < 0:
		return notFound()
	case !s.mine(i):
		return forbidden()
	case !s.within("a comment", body, mostComment):
		return tooLong("Body")
	}
	s.comments[i].Body = body
	return answer{status: http.StatusOK, value: s.comment(s.comments[i])}
}

func (s *Server) deleteComment(in *call) answer {
	i := s.find(in)
	switch {
	case i < 0:
		return notFound()
	case !s.mine(i):
		return forbidden()
	}
	s.comments = slices.Delete(s.comments, i, i+1)
	return answer{status: http.StatusNoContent}
}
