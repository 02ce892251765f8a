// Package kernel answers the requests of notebook clients: it ties the sockets
// of package wire to the session that runs cells, and registers the kernel with
// the clients.
package kernel
