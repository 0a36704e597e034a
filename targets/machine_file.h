// A machine description being read: typed access to its TOML with a message at the exact place for every key
// that is unknown, missing or impossible. All faults of a file are collected before it is refused.
#pragma once

#include <initializer_list>
#include <limits>
#include <map>
#include <string>
#include <string_view>
#include <vector>

#define TOML_EXCEPTIONS 1
#include <toml++/toml.h>

#include "circuit/message.h"
#include "targets/target.h"

namespace isinglass {

class MachineFile {
 public:
  /// Reads and parses. Throws Failure as read_target() does.
  explicit MachineFile(const std::string& path);

  const std::string& path() const { return path_; }
  const std::string& text() const { return text_; }
  const toml::table& root() const { return root_; }

  /// Remembers a fault at this place; the same fault at the same place counts once.
  void complain(const toml::source_region& where, std::string what, std::string help = {});
  /// Throws Failure(target_cannot) with everything that was complained about, if anything was.
  void refuse_if_faulty() const;
  /// The same after a complaint.
  [[noreturn]] void refuse() const;
  /// The Figure::origin of what is stated at this node.
  std::uint32_t origin_of(const toml::node& node);

 private:
  std::string path_;
  std::string text_;
  toml::table root_;
  std::vector<Message> faults_;
  std::map<const toml::node*, std::uint32_t> origins_;
};

/// Bounds of a value, both allowed unless `above` (then the lower one is not).
struct Range {
  double least = -std::numeric_limits<double>::infinity();
  double most = std::numeric_limits<double>::infinity();
  bool above = false;
};
inline constexpr Range positive{0, std::numeric_limits<double>::infinity(), true};
inline constexpr Range not_negative{0, std::numeric_limits<double>::infinity(), false};
inline constexpr Range probability{0, 1, false};

/// One table of the file. Every getter leaves `value` alone when the key is absent, complains when it is
/// required, and remembers which keys were asked for; finish() complains about all others.
class Section {
 public:
  enum class Need { optional, required };

  /// The table `name` ("pair"; "" = the top of the file); an absent one is empty.
  Section(MachineFile& file, std::string_view name);
  /// A table within an array of tables.
  Section(MachineFile& file, std::string title, const toml::table& table);

  bool exists() const { return table_ != nullptr; }
  bool has(std::string_view key) const { return table_ != nullptr && table_->contains(key); }
  const toml::source_region& where() const;

  void number(std::string_view key, double& value, Range range, Need need = Need::optional);
  void whole(std::string_view key, std::uint32_t& value, std::uint32_t least, std::uint32_t most,
             Need need = Need::optional);
  void flag(std::string_view key, bool& value);
  void words(std::string_view key, std::string& value, Need need = Need::optional);
  /// One of the given words; index of the chosen one.
  void choice(std::string_view key, std::size_t& value, std::initializer_list<std::string_view> words);
  /// A number, or [number, standard deviation]. Both are multiplied by `factor`; the number must lie in
  /// `range` then.
  void figure(std::string_view key, Figure& value, double factor = 1, Need need = Need::optional,
              Range range = probability);
  /// The node itself, for what has a form of its own; nullptr when absent.
  const toml::node* node(std::string_view key, Need need = Need::optional);

  /// Complains about every key that nobody asked for.
  void finish();

 private:
  MachineFile& file_;
  std::string title_;
  const toml::table* table_ = nullptr;
  std::vector<std::string> known_;
};

/// Applies the tables [machine], [ion] and [pair] to `target`, whose ions are set and whose figures hold
/// where the file says nothing. `complete` demands the figures that a description by figures alone cannot do
/// without.
void apply_figures(MachineFile& file, Target& target, bool complete);

}  // namespace isinglass
