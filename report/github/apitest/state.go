package apitest

import "slices"

// User is somebody on the host.
type User struct {
	ID    int64
	Login string
	Type  string // "Bot" or "User"; empty on hosts that do not tell
}

// Person is a user with an account.
func Person(login string) User { return User{ID: idOf(login), Login: login, Type: "User"} }

// Bot is the user that an app acts as.
func Bot(app string) User { return User{ID: idOf(app), Login: app + "[bot]", Type: "Bot"} }

// idOf gives a login a number of its own.
func idOf(login string) (n int64) {
	for _, c := range login {
		n = n*31%999983 + int64(c)
	}
	return n + 1
}

// Comment is a comment on a pull request.
type Comment struct {
	ID     int64
	Pull   int
	Author User
	Body   string
}

// CheckRun is a check run as it stands.
type CheckRun struct {
	ID                      int64
	Name, HeadSHA, External string
	Status, Conclusion      string
	Title, Summary, Details string
	App                     string
	Annotations             []Annotation
}

// Annotation is a remark on a line of a file.
type Annotation struct {
	Path, Level, Title, Message string
	Line                        int
}

// Status is a commit status.
type Status struct {
	SHA, State, Context, Description, Target string
}

// Pull is a pull request.
type Pull struct {
	Number      int
	State       string // "open" if empty
	Title       string
	OpenedBy    string // login
	Head, Base  Branch
	HeadOf      string // repository of the head, for forks; the server's own if empty
	HeadGone    bool   // that repository was deleted
	Draft       bool
	Merged      bool
	MergeCommit string
	Commits     []string // whose pull requests it is listed under, besides the head
}

// Branch is a branch and the commit that it points to.
type Branch struct{ Ref, SHA string }

// state is what the host remembers.
type state struct {
	comments []Comment
	checks   []CheckRun
	statuses []Status
	pulls    []Pull
	last     int64 // id given last
}

func newState() state { return state{last: 1000} }

func (s *state) next() int64 {
	s.last++
	return s.last
}

// Comments lists the comments on a pull request, oldest first.
func (s *Server) Comments(pull int) (found []Comment) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.of(pull)
}

func (s *state) of(pull int) (found []Comment) {
	for _, c := range s.comments {
		if c.Pull == pull {
			found = append(found, c)
		}
	}
	return found
}

// CheckRuns lists the check runs, oldest first.
func (s *Server) CheckRuns() []CheckRun {
	s.mu.Lock()
	defer s.mu.Unlock()
	return slices.Clone(s.checks)
}

// Statuses lists the commit statuses, oldest first.
func (s *Server) Statuses() []Status {
	s.mu.Lock()
	defer s.mu.Unlock()
	return slices.Clone(s.statuses)
}

// AddComment puts a comment there, as its author would.
func (s *Server) AddComment(pull int, author User, body string) Comment {
	s.mu.Lock()
	defer s.mu.Unlock()
	c := Comment{s.next(), pull, author, body}
	s.comments = append(s.comments, c)
	return c
}

// AddCheckRun puts a check run there and gives it its id.
func (s *Server) AddCheckRun(c CheckRun) CheckRun {
	s.mu.Lock()
	defer s.mu.Unlock()
	c.ID = s.next()
	s.checks = append(s.checks, c)
	return c
}

// AddPull puts a pull request there.
func (s *Server) AddPull(p Pull) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.pulls = append(s.pulls, p)
}
