// Command service answers comparisons over HTTP: it shows the library inside a
// handler, with limits, deadlines and typed errors mapped to status codes.
//
//	go run ./examples/service -address 127.0.0.1:8080
//	curl --data-binary @tiles.csv 'http://127.0.0.1:8080/compare?response=strength&group=oven&covariate=moisture'
//
// It listens on the loopback address by default. Behind anything public it needs what such services need:
// authentication, transport security, and a limit on the rate of requests.
package main

import (
	"context"
	"errors"
	"flag"
	"log"
	"net"
	"net/http"
	"os"
	"os/signal"
	"time"
)

func main() {
	address := flag.String("address", "127.0.0.1:8080", "`host:port` to listen on")
	limits := Limits{}
	flag.Int64Var(&limits.Bytes, "bytes", 16<<20, "largest request body")
	flag.Int64Var(&limits.Rows, "rows", 500_000, "largest number of rows")
	flag.DurationVar(&limits.Time, "time", 10*time.Second, "longest time for one answer")
	flag.IntVar(&limits.Parallel, "parallel", 4, "answers worked on at once")
	flag.Parse()
	if limits.Bytes < 1 || limits.Rows < 1 || limits.Time <= 0 || limits.Parallel < 1 {
		log.Fatal("limits must be positive")
	}
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	defer stop()
	if err := serve(ctx, *address, limits); err != nil {
		log.Fatal(err)
	}
}

// serve listens until the context is done, then lets answers under way finish.
func serve(ctx context.Context, address string, limits Limits) error {
	listener, err := net.Listen("tcp", address)
	if err != nil {
		return err
	}
	log.Printf("listening on http://%s/compare", listener.Addr())
	s := &http.Server{
		Handler:           NewHandler(limits),
		ReadHeaderTimeout: 5 * time.Second,
		ReadTimeout:       limits.Time + 5*time.Second,
		WriteTimeout:      2*limits.Time + 10*time.Second,
		MaxHeaderBytes:    1 << 16,
	}
	done := make(chan error, 1)
	go func() {
		<-ctx.Done()
		last, cancel := context.WithTimeout(context.Background(), limits.Time+time.Second)
		defer cancel()
		done <- s.Shutdown(last)
	}()
	if err := s.Serve(listener); !errors.Is(err, http.ErrServerClosed) {
		return err
	}
	return <-done
}
