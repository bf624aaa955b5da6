module heavyspot

go 1.26.0

require (
	github.com/alecthomas/kong v1.17.0 // indirect
	github.com/coreos/go-systemd/v22 v22.7.0 // indirect
	github.com/eclipse/paho.mqtt.golang v1.5.1 // indirect
	github.com/google/go-cmp v0.7.0 // indirect
	github.com/gorilla/websocket v1.5.3 // indirect
	github.com/mochi-mqtt/server/v2 v2.7.9 // indirect
	github.com/pelletier/go-toml/v2 v2.4.3 // indirect
	github.com/rs/xid v1.4.0 // indirect
	go.etcd.io/bbolt v1.5.0 // indirect
	go.uber.org/goleak v1.3.0 // indirect
	golang.org/x/net v0.44.0 // indirect
	golang.org/x/sync v0.20.0 // indirect
	golang.org/x/sys v0.50.0 // indirect
	golang.org/x/term v0.48.0 // indirect
	gonum.org/v1/gonum v0.17.0 // indirect
	periph.io/x/conn/v3 v3.7.3 // indirect
	periph.io/x/host/v3 v3.8.5 // indirect
	pgregory.net/rapid v1.3.0 // indirect
)
