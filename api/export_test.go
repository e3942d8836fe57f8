package api

import "jointledger/service"

// Route is one operation as the server knows it, for comparison with the
// document.
type Route struct {
	Method, Path string
	Least        service.Role
	Query        []string
	Media        string
}

// Routes lists every operation.
func Routes() []Route {
	var list []Route
	for _, r := range (&server{}).routes() {
		list = append(list, Route{r.method, r.path, r.least, r.query, r.media})
	}
	return list
}

// ProblemTypes lists the types of problems with their statuses.
func ProblemTypes() map[string]int {
	types := map[string]int{}
	for _, k := range problemKinds {
		types["/problems/"+string(k.code)] = k.status
	}
	return types
}
