// The timed gate list as JSON and CSV; see timeline.h.
#include "output/timeline.h"

#include <nlohmann/json.hpp>

#include "output/summary.h"
#include "output/text.h"

namespace isinglass {

namespace {

std::string json_text(const std::string& text) {
  return nlohmann::json(text).dump(-1, ' ', false, nlohmann::json::error_handler_t::replace);
}

/// One entry of the list as the writers see it, whatever the format.
struct Row {
  std::uint64_t id = 0;
  const TimedOperation& entry;
  const Operation* op = nullptr;  // none for prepare and for waits that the source did not ask for
  double at = 0;                  // from the start of the program
};

/// Walks through all entries, arms included, in the order of the file.
template <class Writer>
class Walk {
 public:
  Walk(const Compiled& compiled, Writer& writer) : compiled_(compiled), writer_(writer) {}

  void block(std::uint32_t index, double begin, const std::string& place) {
    const Circuit& circuit = compiled_.placed.circuit;
    for (const TimedOperation& entry : compiled_.timed.blocks[index].operations) {
      const Operation* op =
          entry.operation == no_operation ? nullptr : &circuit.blocks[index][entry.operation];
      const Row row{next_id_++, entry, op, begin + entry.at};
      writer_.begin(row, place);
      if (entry.kind == TimedKind::decide) {
        const Branch& branch = circuit.branches[op->payload];
        for (std::size_t arm = 0; arm < branch.arms.size(); ++arm) {
          const std::string title = arm_title(branch, arm);
          writer_.begin_arm(title, arm);
          block(branch.arms[arm].block, row.at + compiled_.target.feed_forward_us,
                place + fmt::format("{}/{} ", row.id, title));
          writer_.end_arm();
        }
      }
      writer_.end(row);
    }
  }

 private:
  std::string arm_title(const Branch& branch, std::size_t arm) const {
    if (branch.kind == Branch::Kind::if_else) return arm == 0 ? "then" : "else";
    if (branch.kind == Branch::Kind::switch_case) return arm_text(branch, arm, compiled_.placed.circuit);
    return "round";
  }

  const Compiled& compiled_;
  Writer& writer_;
  std::uint64_t next_id_ = 0;
};

/// Ions of an entry: in place, or the operands of the circuit's operation.
std::span<const std::uint32_t> ions_of(const Row& row, const Circuit& circuit) {
  if (row.op != nullptr) return circuit.operands(*row.op);
  return {row.entry.ion, row.entry.ion_count};
}

class JsonRows {
 public:
  JsonRows(TextWriter& out, const Compiled& compiled)
      : out_(out), circuit_(compiled.placed.circuit), bits_(bit_names(circuit_)) {}

  void begin(const Row& row, const std::string&) {
    const TimedOperation& entry = row.entry;
    if (!is_first_) out_.add(",");
    is_first_ = false;
    out_.add("\n    {\"id\": ", row.id, ", \"kind\": \"", name(entry.kind), "\", \"ions\": [");
    list(ions_of(row, circuit_));
    out_.add("]");
    angles(row);
    if (entry.kind == TimedKind::measure && row.op->payload != no_bit) {
      out_.add(", \"bits\": [", json_text(bits_[row.op->payload]), "]");
    }
    if (entry.kind == TimedKind::compute) {
      out_.add(", \"statement\": ",
               json_text(statement_text(circuit_.statements[row.op->payload], circuit_)));
    }
    if (entry.kind == TimedKind::decide) {
      out_.add(", \"condition\": ", json_text(branch_text(circuit_.branches[row.op->payload], circuit_)));
    }
    out_.add(", \"at\": ", row.at, ", \"takes\": ", entry.takes, ", \"error\": ", entry.error);
    if (entry.crosstalk > 0) out_.add(", \"crosstalk\": ", entry.crosstalk);
    out_.add(", \"from\": [");
    if (row.op != nullptr) lines(row.op->origin);
    out_.add("]");
    if (entry.kind == TimedKind::decide) out_.add(", \"arms\": [");
  }
  void begin_arm(const std::string& title, std::size_t arm) {
    out_.add(arm > 0 ? ", " : "", "{\"when\": ", json_text(title), ", \"operations\": [");
    is_first_ = true;
  }
  void end_arm() {
    out_.add("]}");
    is_first_ = false;
  }
  void end(const Row& row) { out_.add(row.entry.kind == TimedKind::decide ? "]}" : "}"); }

 private:
  template <class Numbers>
  void list(const Numbers& numbers) {
    std::string_view separator;
    for (const std::uint32_t number : numbers) {
      out_.add(separator, std::uint64_t{number});
      separator = ", ";
    }
  }

  void lines(Origin origin) {
    if (origin.code == 0) return;
    if (origin.code < 0x80000000u) {
      out_.add(std::uint64_t{origin.code});
    } else {
      list(circuit_.origins.lines(origin));
    }
  }

  void angle(const Operation& op, int which) {
    if (op.form[which] == 0) {
      out_.add(op.value[which]);
    } else {
      out_.add(json_text(angle_text(op.angle(which), circuit_)));
    }
  }

  void angles(const Row& row) {
    switch (row.entry.kind) {
      case TimedKind::r:
        out_.add(", \"theta\": ");
        angle(*row.op, 0);
        out_.add(", \"phi\": ");
        angle(*row.op, 1);
        break;
      case TimedKind::xx:
        out_.add(", \"theta\": ");
        angle(*row.op, 0);
        out_.add(", \"phi\": [");
        angle(*row.op, 1);
        out_.add(", ");
        angle(*row.op, 2);
        out_.add("]");
        break;
      case TimedKind::rz:
        out_.add(", \"phi\": ");
        angle(*row.op, 0);
        break;
      default:
        break;
    }
  }

  TextWriter& out_;
  const Circuit& circuit_;
  std::vector<std::string> bits_;
  bool is_first_ = true;
};

class CsvRows {
 public:
  CsvRows(TextWriter& out, const Compiled& compiled)
      : out_(out), circuit_(compiled.placed.circuit), bits_(bit_names(circuit_)) {}

  void begin(const Row& row, const std::string& place) {
    const TimedOperation& entry = row.entry;
    out_.add(row.id, ",", name(entry.kind), ",");
    std::string_view separator;
    for (const std::uint32_t ion : ions_of(row, circuit_)) {
      out_.add(separator, std::uint64_t{ion});
      separator = " ";
    }
    out_.add(",");
    angles(row);
    if (entry.kind == TimedKind::measure && row.op->payload != no_bit) out_.add(cell(bits_[row.op->payload]));
    out_.add(",", row.at, ",", entry.takes, ",", entry.error, ",", entry.crosstalk, ",");
    if (row.op != nullptr) {
      separator = "";
      for (const std::uint32_t line : circuit_.origins.lines(row.op->origin)) {
        out_.add(separator, std::uint64_t{line});
        separator = " ";
      }
    }
    out_.add(",");
    if (entry.kind == TimedKind::compute) {
      out_.add(cell(statement_text(circuit_.statements[row.op->payload], circuit_)));
    }
    if (entry.kind == TimedKind::decide) {
      out_.add(cell(branch_text(circuit_.branches[row.op->payload], circuit_)));
    }
    out_.add(",", cell(place.empty() ? place : place.substr(0, place.size() - 1)), "\n");
  }
  void begin_arm(const std::string&, std::size_t) {}
  void end_arm() {}
  void end(const Row&) {}

  static constexpr std::string_view heading =
      "id,kind,ions,theta,phi,bits,at,takes,error,crosstalk,from,condition,arm\n";

 private:
  /// Quoted where the text would else be more than one cell.
  static std::string cell(const std::string& text) {
    if (text.find_first_of(",\"\n\r") == std::string::npos) return text;
    std::string result = "\"";
    for (const char byte : text) {
      if (byte == '"') result += '"';
      result += byte;
    }
    return result + "\"";
  }

  void angle(const Operation& op, int which) {
    if (op.form[which] == 0) {
      out_.add(op.value[which]);
    } else {
      out_.add(cell(angle_text(op.angle(which), circuit_)));
    }
  }

  void angles(const Row& row) {
    switch (row.entry.kind) {
      case TimedKind::r:
        angle(*row.op, 0);
        out_.add(",");
        angle(*row.op, 1);
        out_.add(",");
        break;
      case TimedKind::xx:
        angle(*row.op, 0);
        out_.add(",");
        angle(*row.op, 1);
        out_.add(" ");
        angle(*row.op, 2);
        out_.add(",");
        break;
      case TimedKind::rz:
        out_.add(",");
        angle(*row.op, 0);
        out_.add(",");
        break;
      default:
        out_.add(",,");
        break;
    }
  }

  TextWriter& out_;
  const Circuit& circuit_;
  std::vector<std::string> bits_;
};

}  // namespace

void write_timeline_json(std::ostream& stream, const Compiled& compiled) {
  const Placed& placed = compiled.placed;
  TextWriter out(&stream);
  out.add("{ \"format\": \"isinglass-timeline\", \"version\": 1,\n");
  out.add("  \"source\": {\"file\": ", json_text(compiled.source_file), ", \"sha256\": \"",
          compiled.source_sha256, "\"},\n");
  out.add("  \"target\": {\"name\": ", json_text(compiled.target.name), ", \"sha256\": \"",
          compiled.target.sha256, "\"},\n");
  out.add("  \"units\": {\"time\": \"us\", \"angle\": \"rad\"}, \"ions\": ",
          std::uint64_t{placed.circuit.wires}, ",\n  \"placement\": [");
  for (std::uint32_t q = 0; q < placed.start.size(); ++q) {
    out.add(q > 0 ? "," : "", "\n    {\"qubit\": ", json_text(placed.circuit.wire_name(q)),
            ", \"start\": ", std::uint64_t{placed.start[q]},
            ", \"end\": ", std::uint64_t{placed.circuit.end_wire[q]}, "}");
  }
  out.add("],\n  \"operations\": [");
  JsonRows rows(out, compiled);
  Walk(compiled, rows).block(0, 0, "");
  out.add("],\n  \"totals\": ", json_of(compiled.timed.totals).dump(),
          ",\n  \"before\": ", json_of(compiled.before).dump(), " }\n");
}

void write_timeline_csv(std::ostream& stream, const Compiled& compiled) {
  TextWriter out(&stream);
  out.add(CsvRows::heading);
  CsvRows rows(out, compiled);
  Walk(compiled, rows).block(0, 0, "");
}

}  // namespace isinglass
