package scpi

const QueueOverflow = -350
