// Package mqtt delivers the messages of the outbox to an MQTT broker, and holds
// a broker of its own for machines that have none.
//
// A message leaves the outbox only after the broker's acknowledgement. Messages
// go out in the order of their sequence numbers with QoS 1 and a small number
// of them on the way at once; when a connection breaks, those not yet taken out
// of the outbox are sent again over the next one. A receiver may therefore see
// at most that number again and drops them by their sequence numbers.
//
// The client library is used for one connection at a time and thrown away with
// it: reconnecting by itself it would report messages as delivered that no
// broker has acknowledged.
package mqtt
