package wire

import (
	"errors"
	"fmt"
	"io/fs"
	"net"
	"os"
	"strconv"
	"syscall"
)

// listen binds one port of c and stores the one that was chosen when *port is
// zero. The channel names the socket in errors.
func listen(c *Connection, channel string, port *int) (net.Listener, error) {
	if c.Transport == "ipc" {
		return listenIPC(c, channel, port)
	}
	host := c.IP
	if host == "*" {
		host = ""
	}
	l, err := net.Listen("tcp", net.JoinHostPort(host, strconv.Itoa(*port)))
	if err != nil {
		return nil, bindError(channel, fmt.Sprintf("port %d of %s", *port, c.IP), err)
	}
	*port = l.Addr().(*net.TCPAddr).Port
	return l, nil
}

func bindError(channel, place string, err error) error {
	if errors.Is(err, syscall.EADDRINUSE) {
		return fmt.Errorf("the %s socket cannot use %s: it is taken by another program; start the kernel again with another connection file", channel, place)
	}
	var op *net.OpError
	if errors.As(err, &op) {
		err = op.Err
	}
	return fmt.Errorf("the %s socket cannot use %s: %v", channel, place, err)
}

// listenIPC binds the socket file IP-port, which only its owner may use.
func listenIPC(c *Connection, channel string, port *int) (net.Listener, error) {
	for try := *port; ; try++ {
		if *port == 0 && try == 0 {
			continue
		}
		path := c.IP + "-" + strconv.Itoa(try)
		l, err := bindFile(path)
		if *port == 0 && errors.Is(err, syscall.EADDRINUSE) && try < 1<<16 {
			continue
		}
		if err != nil {
			return nil, bindError(channel, "file "+path, err)
		}
		*port = try
		return l, nil
	}
}

func bindFile(path string) (net.Listener, error) {
	if abandoned(path) {
		os.Remove(path)
	}
	return privately(func() (net.Listener, error) { return net.Listen("unix", path) })
}

// abandoned reports whether path is a socket file on which nobody listens.
func abandoned(path string) bool {
	info, err := os.Stat(path)
	if err != nil || info.Mode()&fs.ModeSocket == 0 {
		return false
	}
	conn, err := net.Dial("unix", path)
	if err == nil {
		conn.Close()
	}
	return errors.Is(err, syscall.ECONNREFUSED)
}
