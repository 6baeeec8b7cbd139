#!/bin/sh
# Proves by disassembly that every build of every kernel is there and holds the instructions that it claims.
#
# For each line of `list_builds` (id, variant, marks): the symbol kernels::<family>::<stem>::<variant> exists, and its
# machine code has an instruction whose mnemonic starts with each mark. The FMA chains must also keep every vector in a
# register: their code may not touch the stack. x86-64 always; aarch64 too when its target, linker and emulator are
# installed. Ends with 1, naming what is missing.
set -eu
cd "$(dirname "$0")/.."

# check NAME PROGRAM LISTING DISASSEMBLER...
check() {
    name=$1 program=$2 listing=$3
    shift 3
    "$@" -d -C --no-show-raw-insn "$program" | awk -v name="$name" -v listing="$listing" '
        BEGIN {
            while ((getline line < listing) > 0) {
                n = split(line, field, " ")
                path = field[1]
                sub(/\./, "::", path)
                symbol = "kernels::" path "::" field[2]
                builds++
                order[builds] = symbol
                for (i = 3; i <= n; i++) marks[symbol] = marks[symbol] " " field[i]
            }
        }
        /^[0-9a-f]+ <.*>:$/ {
            symbol = $0
            sub(/^[0-9a-f]+ </, "", symbol)
            sub(/>:$/, "", symbol)
            inside = symbol in marks
            if (inside) present[symbol] = 1
            next
        }
        inside && /^ *[0-9a-f]+:\t/ {
            split($0, part, "\t")
            split(part[2], word, " ")
            n = split(marks[symbol], mark, " ")
            for (i = 1; i <= n; i++) if (index(word[1], mark[i]) == 1) found[symbol, mark[i]] = 1
            if (symbol ~ /::fma::/ && part[2] ~ /[xyz]mm/ && part[2] ~ /%rsp/) spills[symbol]++
            if (symbol ~ /::fma::/ && part[2] ~ /^(ldr|str|ldp|stp)[ \t]+q[0-9]/ && part[2] ~ /\[sp/) spills[symbol]++
        }
        END {
            if (builds == 0) { print "check-isa: " name ": no builds listed"; exit 1 }
            for (b = 1; b <= builds; b++) {
                symbol = order[b]
                if (!(symbol in present)) { print "check-isa: " name ": no symbol " symbol; bad++; continue }
                n = split(marks[symbol], mark, " ")
                if (n == 0) { print "check-isa: " name ": " symbol " claims no mark"; bad++ }
                for (i = 1; i <= n; i++) if (!((symbol, mark[i]) in found)) {
                    print "check-isa: " name ": " symbol " has no " mark[i]
                    bad++
                }
                if (symbol in spills) {
                    print "check-isa: " name ": " symbol " moves vectors through the stack " spills[symbol] " times"
                    bad++
                }
            }
            if (bad) exit 1
            print "check-isa: " name ": " builds " builds hold their instructions"
        }' >&2
}

target=${CARGO_TARGET_DIR:-target}
listing=$(mktemp)
trap 'rm -f "$listing"' EXIT
failed=0

if [ "$(uname -m)" = x86_64 ]; then
    cargo build --release --quiet -p kernels --example list_builds
    "$target/release/examples/list_builds" > "$listing"
    check x86-64 "$target/release/examples/list_builds" "$listing" objdump || failed=1
fi

arm=aarch64-unknown-linux-gnu
if rustc --print target-libdir --target $arm 2>/dev/null | xargs test -d &&
    command -v aarch64-linux-gnu-gcc > /dev/null && command -v aarch64-linux-gnu-objdump > /dev/null &&
    command -v qemu-aarch64 > /dev/null; then
    CARGO_TARGET_AARCH64_UNKNOWN_LINUX_GNU_LINKER=aarch64-linux-gnu-gcc \
        cargo build --release --quiet -p kernels --example list_builds --target $arm
    qemu-aarch64 -L /usr/aarch64-linux-gnu "$target/$arm/release/examples/list_builds" > "$listing"
    check aarch64 "$target/$arm/release/examples/list_builds" "$listing" aarch64-linux-gnu-objdump || failed=1
else
    echo "check-isa: aarch64: skipped, its target, cross linker or emulator is not installed" >&2
fi
exit $failed
